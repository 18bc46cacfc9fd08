/* An engine is put together and taken apart here, and nowhere else. Knows which rooms keep state in it, not what the state
 * is. */
#include "engine/termwise.h"

#include <stdlib.h>

#include "engine/base/engine.h"
#include "engine/expr/expr.h"
#include "engine/expr/facts.h"
#include "engine/rewrite/pattern_node.h"

static tw_status rooms_init(void *host)
{
    tw_engine *e = host;
    expr_table_init(e);
    facts_init(e);
    return TW_OK;
}

void tw_engine_free(tw_engine *e)
{
    if (!e)
        return;
    matching_free(e->matching);
    facts_clear(e);
    expr_table_clear(e);
    engine_base_clear(e);
    free(e);
}

tw_engine *tw_engine_new(void)
{
    tw_engine *e = malloc(sizeof *e);
    if (!e)
        return NULL;
    engine_base_init(e);
    if (engine_protect(e, rooms_init, e) != TW_OK) {
        tw_engine_free(e);
        return NULL;
    }
    return e;
}
