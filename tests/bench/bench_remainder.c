/* Times (CPU, median of five) and tightness of the panels' bounds over the table of test_panels. */
#include "tests/engine/numeric/table.h"

static int compare(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

int main(void)
{
    enum { RUNS = 5 };
    for (int k = 0; k < TABLE_ROWS; k++) {
        table_result r;
        double one[RUNS], all[RUNS];
        bool fine = true;
        for (int j = 0; j < RUNS && fine; j++) {
            fine = table_run(table_rows + k, &r);
            one[j] = r.one_ms;
            all[j] = r.all_ms;
        }
        if (!fine) {
            printf("%-12s s=%ld: not made: %s\n", table_rows[k].name, (long)table_rows[k].s, r.report.reason ? r.report.reason : "?");
            continue;
        }
        qsort(one, RUNS, sizeof *one, compare);
        qsort(all, RUNS, sizeof *all, compare);
        r.one_ms = one[RUNS / 2];
        r.all_ms = all[RUNS / 2];
        table_print(table_rows + k, &r);
    }
    return 0;
}
