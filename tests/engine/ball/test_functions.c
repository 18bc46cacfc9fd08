/* Every function of the table on balls and as power series: values against mpmath, enclosures against points inside,
 * the flag `analytic` against the mean value property, series against derivatives. */
#include "tests/engine/ball/balls.h"

#include <math.h>

#include "engine/expr/facts.h"

typedef struct reference {
    const char *f;
    double re, im;
    const char *real, *imaginary;
} reference;

/* mpmath 1.3.0 at 45 digits, its functions of the same names (loggamma, digamma, gammainc, ...). */
static const reference references[] = {
    {"exp(x)", 1.25, 0.0, "3.490342957461841376130546029672265482652", "0.0"},
    {"exp(x)", -2.0, 3.0, "-0.1339809149295426134614052554611557354801", "0.01909851626113519643257624085880092542722"},
    {"log(x)", 2.5, 0.0, "0.9162907318741550651835272117680110714501", "0.0"},
    {"log(x)", -1.0, 0.5, "0.1115717756571048778831475451549172516873", "2.677945044588987122248387151818288482169"},
    {"sin(x)", 3.0, 0.0, "0.1411200080598672221007448028081102798469", "0.0"},
    {"sin(x)", 1.0, -2.0, "3.165778513216168146740734617191905538379", "-1.959601041421605897070352049989358278436"},
    {"cos(x)", 3.0, 0.0, "-0.9899924966004454572715727947312613023937", "0.0"},
    {"cos(x)", 1.0, 2.0, "2.032723007019665529436343448499514263732", "-3.051897799151800057512115686895105452888"},
    {"tan(x)", 1.25, 0.0, "3.009569673862831288157563894386243931392", "0.0"},
    {"tan(x)", 1.0, 2.0, "0.03381282607989669028437055972528730164019", "1.014793616146633568117054175417967614163"},
    {"sinh(x)", 1.5, 0.0, "2.129279455094817496834387494677631648832", "0.0"},
    {"sinh(x)", 1.0, 2.0, "-0.4890562590412936735864545685485159211585", "1.403119250622040588019490859767712944071"},
    {"cosh(x)", 1.5, 0.0, "2.352409615243247325767667965441644170174", "0.0"},
    {"cosh(x)", -1.0, 2.0, "-0.6421481247155199648448006869622787894704", "-1.068607421382778339597440033783951588665"},
    {"tanh(x)", 0.5, 0.0, "0.4621171572600097585023184836436725487303", "0.0"},
    {"tanh(x)", 0.25, 2.0, "1.099398135211778910672604318145064591418", "-1.596689210770755827812454860131856144003"},
    {"asin(x)", 0.5, 0.0, "0.5235987755982988730771072305465838140329", "0.0"},
    {"asin(x)", 2.0, 1.0, "1.063440023577752056189491997089551002852", "1.469351744368185273255844317361647616788"},
    {"acos(x)", 0.5, 0.0, "1.047197551196597746154214461093167628066", "0.0"},
    {"acos(x)", 2.0, -1.0, "0.5073563032171445630418296945502004392467", "1.469351744368185273255844317361647616788"},
    {"atan(x)", 3.0, 0.0, "1.249045772398254425829917077281090123078", "0.0"},
    {"atan(x)", 0.5, 2.0, "1.421546861001806980263757720731115968084", "0.5003700000525310174418340844513148810936"},
    {"asinh(x)", 2.0, 0.0, "1.443635475178810342493276740273105269406", "0.0"},
    {"asinh(x)", 0.5, 3.0, "1.778990493826768629595882881105893717395", "1.396149861709447351130882508519847587502"},
    {"acosh(x)", 2.5, 0.0, "1.566799236972411078664056862580483493862", "0.0"},
    {"acosh(x)", -2.0, 1.0, "1.469351744368185273255844317361647616788", "2.63423635037264867542081368872930244495"},
    {"atanh(x)", 0.5, 0.0, "0.5493061443340548456976226184612628523237", "0.0"},
    {"atanh(x)", 2.0, 1.0, "0.4023594781085250936501898333065469098814", "1.338972522294493561124193575909144241084"},
    {"erf(x)", 0.75, 0.0, "0.7111556336535151315989378345914107773742", "0.0"},
    {"erf(x)", 1.0, 1.0, "1.316151281697947644880271080243670369028", "0.1904534692378346862841088619691624424378"},
    {"erfc(x)", 3.0, 0.0, "0.00002209049699858544137277612958232037984771", "0.0"},
    {"erfc(x)", 1.0, -1.0, "-0.3161512816979476448802710802436703690277", "0.1904534692378346862841088619691624424378"},
    {"Gamma(x)", 3.75, 0.0, "4.422988410460250562887839188700432995354", "0.0"},
    {"Gamma(x)", -1.5, 1.0, "0.1907106718894975190560866251214792199112", "0.1741861426165150979907055600577901226042"},
    {"lnGamma(x)", 3.75, 0.0, "1.486815578593417055540581801444205025413", "0.0"},
    {"lnGamma(x)", -1.5, 1.0, "-1.353689918032300851765724215700161354204",
     "-5.543041710180497532225835354489902836328"},
    {"psi(x)", 0.25, 0.0, "-4.227453533376265408089530146096683577367", "0.0"},
    {"psi(x)", -2.5, 1.0, "1.154604396750945547393073407860850078783", "2.810563859990945595635471985061874743757"},
    {"zeta(x)", 3.5, 0.0, "1.126733867317056646427812491854984272222", "0.0"},
    {"zeta(x)", 0.5, 10.0, "1.544895220296752766921495888075972644268", "-0.1153364652712733754365914435660597498478"},
    {"E1(x)", 1.5, 0.0, "0.1000195824066326519019093399116669782617", "0.0"},
    {"E1(x)", -1.0, 1.0, "-1.764625985563854068426738161351237966008", "-0.7538228020792708191998512941757068197898"},
    {"Ei(x)", 1.5, 0.0, "3.301285449129797837957411316134742787657", "0.0"},
    {"Ei(x)", -2.0, 0.0, "-0.04890051070806111956723983522804952231449", "0.0"},
    {"Ai(x)", 1.0, 0.0, "0.1352924163128814155241474235154663061749", "0.0"},
    {"Ai(x)", -2.0, 1.0, "0.5563045393711925220874145020645369086698", "0.7898014381882758204808083922368308041873"},
    {"Bi(x)", 1.0, 0.0, "1.207423594952871259436378817028286995385", "0.0"},
    {"Bi(x)", -2.0, 1.0, "-0.8669433867252541437750679547573627532799", "0.480098103640651504366515320158148474179"},
    {"J(1/3, x)", 2.5, 0.0, "0.1983209334186081246848563732907216163656", "0.0"},
    {"Y(1/3, x)", 2.5, 0.0, "0.4614594741912908366876950793840776778561", "0.0"},
    {"I(1/3, x)", 2.5, 0.0, "3.174324229724197135699310785048456785074", "0.0"},
    {"K(1/3, x)", 2.5, 0.0, "0.06354253745473336981775457327131419865338", "0.0"},
    {"J(2, x)", 2.5, 0.0, "0.4460590584396172267359407998627412276488", "0.0"},
    {"Gamma(1/3, x)", 2.5, 0.0, "0.03686052091852648031711127141193224333521", "0.0"},
    {"polygamma(2, x)", 2.5, 0.0, "-0.2362040516417274030037416685677072781172", "0.0"},
    {"Beta(x, 3/2)", 2.5, 0.0, "0.1963495408493620774039152114549689302623", "0.0"},
    {"x^(2/3)", 2.5, 0.0, "1.842015749320193302889911416789903610959", "0.0"},
    {"x^(-7/5)", 2.5, 0.0, "0.277257937262058557152900740607628550672", "0.0"},
    {"x^x", 2.5, 0.0, "9.882117688026185412496542326352245417874", "0.0"},
    {"x^(-1/2)", 2.5, 0.0, "0.6324555320336758663997787088865437067439", "0.0"},
    {"sqrt(1 + x) - 1", 2.5, 0.0, "0.870828693386970692791874366158274650878", "0.0"},
    {"3 - 3*cos(x)", 2.5, 0.0, "5.403430846640801144500508371402054993286", "0.0"},
    {"cosh(x) - 1", 2.5, 0.0, "5.13228947966368611661985231281756299551", "0.0"},
    {"J(1/3, x)", 1.0, 1.0, "1.021324325071872651865635631637261952621", "-0.1115870737600492332481254092915418134558"},
    {"Y(1/3, x)", 1.0, 1.0, "-0.0470360216071097291002182044879404099122",
     "0.8424092221219808677011669423052311870536"},
    {"I(1/3, x)", 1.0, 1.0, "0.8286992741352131721388057827189501133435", "0.6072994031461069015930234056044426631167"},
    {"K(1/3, x)", 1.0, 1.0, "0.07526325888645208107063817007661910364386",
     "-0.3679693627605949553056166812508091992566"},
    {"J(2, x)", 1.0, 1.0, "0.04157988694396212208283336257837005994406", "0.2473976415133063105105919644784222846179"},
    {"Gamma(1/3, x)", 1.0, 1.0, "0.04508207876730764685436480173344814420991",
     "-0.221486287507385642461795257602847607542"},
    {"polygamma(2, x)", 1.0, 1.0, "0.3685529315879351717366345429805947851677",
     "0.7666528503450662124026953776313700813922"},
    {"Beta(x, 3/2)", 1.0, 1.0, "0.2223188181077921662398969806685968175522",
     "-0.3802979536795142303521751066647640340495"},
    {"x^(2/3)", 1.0, 1.0, "1.091123635971721403560072614189808881326", "0.6299605249474365823836053036391141752851"},
    {"x^(-7/5)", 1.0, 1.0, "0.2794639337330048519749297342335093258176", "-0.5484788522541905565603399385107785049503"},
    {"x^x", 1.0, 1.0, "0.2739572538301210711303421174175029183079", "0.5837007587586146275149618967771680809156"},
    {"x^(-1/2)", 1.0, 1.0, "0.7768869870150186536720794765315734740823", "-0.3217971264527913123677217187091049044621"},
    {"sqrt(1 + x) - 1", 1.0, 1.0, "0.4553466902253548081226618397096970698548",
     "0.3435607497225124641385657439145585684727"},
    {"3 - 3*cos(x)", 1.0, 1.0, "0.4988099246065528533483438169947165605704",
     "2.966693117288595289146388622678058565926"},
    {"cosh(x) - 1", 1.0, 1.0, "-0.1662699748688509511161146056649055201901",
     "0.9888977057628650963821295408926861886421"},
    {"J(2, x)", -3.0, 0.0, "0.4860912605858910769078310941149840348017", "0.0"},
    {"I(1, x)", -3.0, 0.0, "-3.953370217402609396478635740580581287584", "0.0"},
    {"abs(x)", 3.0, 0.0, "3.0", "0.0"},
};

static void known_values(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    acb_t v;
    acb_init(v);
    for (size_t k = 0; k < sizeof references / sizeof *references; k++) {
        const reference *r = &references[k];
        value_at(e, v, r->f, r->re, r->im, false, 200);
        if (!acb_is_finite(v) || acb_rel_accuracy_bits(v) < 120 || !holds_decimal(acb_realref(v), r->real) ||
            !holds_decimal(acb_imagref(v), r->imaginary))
            fail_msg("%s at %g + %g i is not %s + %s i", r->f, r->re, r->im, r->real, r->imaginary);
        if (r->im == 0 && !acb_is_real(v)) fail_msg("%s at %g is not exactly real", r->f, r->re);
    }
    acb_clear(v);
    tw_engine_free(e);
}

/* Functions of x with the real interval on which each is real and analytic, and the piece of the complex plane for
 * samples. */
typedef struct sample {
    const char *f;
    double from, to; /* real and analytic there */
} sample;

static const sample samples[] = {
    {"exp(x)", -9, 9},
    {"log(x)", 0.01, 9},
    {"sin(x)", -9, 9},
    {"cos(x)", -9, 9},
    {"tan(x)", -1.5, 1.5},
    {"sinh(x)", -9, 9},
    {"cosh(x)", -9, 9},
    {"tanh(x)", -9, 9},
    {"asin(x)", -0.99, 0.99},
    {"acos(x)", -0.99, 0.99},
    {"atan(x)", -9, 9},
    {"asinh(x)", -9, 9},
    {"acosh(x)", 1.01, 9},
    {"atanh(x)", -0.99, 0.99},
    {"erf(x)", -4, 4},
    {"erfc(x)", -4, 9},
    {"Gamma(x)", 0.05, 9},
    {"lnGamma(x)", 0.05, 9},
    {"psi(x)", 0.05, 9},
    {"zeta(x)", 1.1, 9},
    {"E1(x)", 0.05, 9},
    {"Ei(x)", 0.05, 9},
    {"Ai(x)", -5, 5},
    {"Bi(x)", -5, 5},
    {"J(1/3, x)", 0.05, 9},
    {"Y(1/3, x)", 0.05, 9},
    {"I(1/3, x)", 0.05, 9},
    {"K(1/3, x)", 0.05, 9},
    {"J(2, x)", -9, 9},
    {"I(1, x)", -9, 9},
    {"J(0, x)", -9, 9},
    {"K(0, x)", 0.05, 9},
    {"Gamma(1/3, x)", 0.05, 9},
    {"Gamma(-1, x)", 0.05, 9},
    {"polygamma(2, x)", 0.05, 9},
    {"Beta(x, 3/2)", 0.05, 9},
    {"x^(1/2)", 0.01, 9},
    {"x^(2/3)", 0.01, 9},
    {"x^(-7/5)", 0.01, 9},
    {"x^5", -9, 9},
    {"x^(-2)", 0.1, 9},
    {"x^x", 0.05, 9},
    {"2^x", -9, 9},
    {"exp(x) - 1", -9, 9},
    {"1 - cos(x)", -9, 9},
    {"cosh(x) - 1", -9, 9},
    {"sqrt(1 + x) - 1", -0.99, 9},
    {"2*(1 + x)^(1/3) - 2", -0.99, 9},
    {"log(1 + x)", -0.99, 9},
    {"x/(1 + x^2)", -9, 9},
    {"exp(-x)*sin(x)/(2 + cos(x))", -5, 5},
    {"abs(x)", 0.1, 9},
    {"abs(log(x))", 1.1, 9},
    {"min(x, x^2)", 1.1, 9},
    {"max(1, x, x^2)", 1.1, 9},
    {"sign(x)*x", 0.1, 9},
    {"re(x)*im(x) + conj(x)", 1, 9},
    {"sqrt(x^2 + 1)", -9, 9},
    {"log(sqrt(1 + x^2) - x/2)", -9, 9},
    {"piecewise(x^2 when x < 20, 1 otherwise)", -9, 9},
    {"sum from k = 0 to 6 of x^k/k!", -9, 9},
    {"x*root of t^5 - t - 1 in t near 1", -9, 9},
    {"euler_constant*x + pi", -9, 9},
};
enum { SAMPLES = sizeof samples / sizeof *samples };

static void fail_at(const char *what, const char *f, const acb_t z)
{
    char *re = arb_get_str(acb_realref(z), 20, 0), *im = arb_get_str(acb_imagref(z), 20, 0);
    fprintf(stderr, "at %s + %s i\n", re, im);
    flint_free(re);
    flint_free(im);
    fail_msg("%s: %s", f, what);
}

static void enclosures(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    acb_t z, p, v, w;
    acb_init(z);
    acb_init(p);
    acb_init(v);
    acb_init(w);
    for (size_t k = 0; k < SAMPLES; k++) {
        const sample *s = &samples[k];
        tape *t = tape_of(e, text_parse(e, s->f), expr_symbol(e, "x"));
        int finite = 0;
        for (int trial = 0; trial < 36; trial++) {
            bool real = trial % 2;
            double r = ldexp(1, -(int)random_below(30) + 1);
            box_set(z, random_real(real ? s->from : -9, real ? s->to : 9), random_real(-3, 3), r, real);
            for (int analytic = 0; analytic < 2; analytic++) {
                tape_eval(v, t, z, analytic, 64);
                finite += acb_is_finite(v) && !analytic;
                for (int j = 0; j < 6 && acb_is_finite(v); j++) {
                    point_in(p, z);
                    tape_eval(w, t, p, false, 256);
                    if (acb_is_finite(w) && !acb_overlaps(v, w)) fail_at("a point's value lies outside", s->f, z);
                    if (acb_is_finite(w) && acb_rel_accuracy_bits(w) > 100 && real && r < 1e-3 && !analytic) {
                        acb_sub(w, w, v, 64);
                        if (!acb_contains_zero(w)) fail_at("a point's value lies outside", s->f, z);
                    }
                }
            }
        }
        if (finite < 12) fail_msg("%s is finite on only %d of 36 balls", s->f, finite);
        /* sharp on narrow balls */
        box_set(z, random_real(s->from, s->to), 0, ldexp(1, -120), true);
        tape_eval(v, t, z, false, 128);
        if (!acb_is_finite(v) || acb_rel_accuracy_bits(v) < 70) fail_at("few bits on a narrow ball", s->f, z);
        if (!acb_is_real(v)) fail_at("not exactly real", s->f, z);
        tape_eval(w, t, z, true, 128);
        if (!acb_is_finite(w) || acb_rel_accuracy_bits(w) < 70) fail_at("not seen to be analytic", s->f, z);
        tape_free(t);
    }
    acb_clear(z);
    acb_clear(p);
    acb_clear(v);
    acb_clear(w);
    tw_engine_free(e);
}

/* Where the flag says analytic, the mean over a circle is the value at its centre; a cut, a pole, a kink in between
 * shows. */
static void analytic_means_analytic(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    static const char *const more[] = {
        "log(1 - x)",
        "sqrt(1 - x^2)",
        "asin(x^2)",
        "acosh(x)",
        "atan(1/x)",
        "abs(x)",
        "abs(x^2 - 1)",
        "sign(x - 1)",
        "min(x, 1)",
        "max(x, 1/x)",
        "re(x)",
        "arg(x)",
        "conj(x*i)",
        "abs(x + i)",
        "abs(x*i)*x",
        "re(exp(i*x))",
        "piecewise(x when x < 1, 2 - x otherwise)",
        "log(log(x))",
        "abs(log(x))",
        "sqrt(x)*sqrt(x - 1)",
        "sign(sqrt(x) - 1)",
        "K(1/2, x)",
        "Y(1, x^2)",
        "Gamma(1/2, -x)",
        "lnGamma(x^2)",
        "polygamma(1, x)",
        "x^i",
        "x^(1/3)",
        "E1(-x)",
        "Ei(x^3)",
        "J(1/2, x)",
        "tan(3*x)",
        "1/(1 + x^2)",
        "Gamma(x)/x",
        "zeta(x)",
        "acos(x) + atanh(x)",
        "asinh(2*x)",
        "im(x)*x",
        "Beta(x, x)",
        "(1 + x^3)^(1/2) - 1",
        "log(1 + x^4)",
    };
    enum { MORE = sizeof more / sizeof *more, POINTS = 64 };
    acb_t z, c, p, v, mean;
    acb_init(z);
    acb_init(c);
    acb_init(p);
    acb_init(v);
    acb_init(mean);
    arb_t size;
    arf_t top;
    arb_init(size);
    arf_init(top);
    int seen = 0;
    for (size_t k = 0; k < SAMPLES + MORE; k++) {
        const char *f = k < SAMPLES ? samples[k].f : more[k - SAMPLES];
        tape *t = tape_of(e, text_parse(e, f), expr_symbol(e, "x"));
        for (int trial = 0; trial < 24; trial++) {
            double r = ldexp(1, -(int)random_below(5)), re = random_real(-3, 3),
                   im = trial % 4 ? random_real(-2, 2) : 0;
            acb_set_d_d(c, re, im);
            box_set(z, re, im, r, false);
            tape_eval(v, t, z, true, 64);
            if (!acb_is_finite(v)) continue;
            acb_get_abs_ubound_arf(top, v, 53);
            arf_mul_2exp_si(top, top, -50); /* what 64 points leave of the largest value on the box */
            seen++;
            acb_zero(mean);
            for (int j = 0; j < POINTS; j++) {
                acb_set_d_d(p, re + r / 2 * cos(6.283185307179586 * (j + 0.5) / POINTS),
                            im + r / 2 * sin(6.283185307179586 * (j + 0.5) / POINTS));
                tape_eval(v, t, p, true, 128); /* abs and its like mean their continuation */
                acb_add(mean, mean, v, 128);
            }
            acb_div_ui(mean, mean, POINTS, 128);
            tape_eval(v, t, c, true, 128);
            acb_sub(mean, mean, v, 128);
            acb_abs(size, mean, 64);
            arf_mul_2exp_si(arb_midref(size), arb_midref(size), 12);
            if (!acb_is_finite(mean) || (arf_cmp_si(arb_midref(size), 1) > 0 && arf_cmp(arb_midref(size), top) > 0))
                fail_at("the mean value property fails", f, z);
        }
        tape_free(t);
    }
    if (seen < 400) fail_msg("only %d balls were analytic", seen);
    acb_clear(z);
    acb_clear(c);
    acb_clear(p);
    acb_clear(v);
    acb_clear(mean);
    arb_clear(size);
    arf_clear(top);
    tw_engine_free(e);
}

/* Poles, cuts and kinks give no finite value where one would be wrong. */
static void no_value_where_none_is(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    static const struct {
        const char *f;
        double at;
        bool analytic_only;
    } places[] = {
        {"1/x", 0, false},
        {"log(x)", 0, false},
        {"tan(x)", 1.5707963267948966, false},
        {"Gamma(x)", -2, false},
        {"psi(x)", 0, false},
        {"zeta(x)", 1, false},
        {"E1(x)", 0, false},
        {"x^(-1/2)", 0, false},
        {"atanh(x)", 1, false},
        {"polygamma(1, x)", -1, false},
        {"K(0, x)", 0, false},
        {"Y(1, x)", 0, false},
        {"Beta(x, 1/2)", 0, false},
        {"lnGamma(x)", 0, false},
        {"Ei(x)", 0, false},
        {"1/sin(x)", 0, false},
        {"inf*x", 1, false},
        {"log(x)", -1, true},
        {"sqrt(x)", -1, true},
        {"x^(1/3)", 0, true},
        {"asin(x)", 1, true},
        {"acos(x)", -2, true},
        {"acosh(x)", 1, true},
        {"acosh(x)", 0, true},
        {"E1(x)", -1, true},
        {"lnGamma(x)", -1.5, true},
        {"abs(x)", 0, true},
        {"sign(x)", 0, true},
        {"min(x, 1)", 1, true},
        {"max(x, -x)", 0, true},
        {"abs(x + i)", 1, true},
        {"arg(x)", 0, true},
        {"J(1/2, x)", -1, true},
        {"I(1/3, x)", -1, true},
        {"piecewise(x when x < 1, 1 otherwise)", 1, true},
        {"piecewise(x when x <= 1, 1 otherwise)", 1, true},
        {"piecewise(5 when x = 1, x^2 otherwise)", 1, true},
        {"piecewise(x when x != 1, 7 otherwise)", 1, true},
        {"Gamma(1/2, x)", -1, true},
        {"x^i", -1, true},
    };
    acb_t z, v;
    acb_ptr jet = _acb_vec_init(4);
    acb_init(z);
    acb_init(v);
    for (size_t k = 0; k < sizeof places / sizeof *places; k++) {
        tape *t = tape_of(e, text_parse(e, places[k].f), expr_symbol(e, "x"));
        for (int exact = 0; exact < 2; exact++) {
            box_set(z, places[k].at, 0, exact ? 0 : 1e-6, true);
            bool exactly_there = !exact || places[k].at == floor(2 * places[k].at) / 2;
            if (!places[k].analytic_only && exactly_there) {
                tape_eval(v, t, z, false, 64);
                if (acb_is_finite(v)) fail_at("finite at a pole", places[k].f, z);
            }
            tape_eval(v, t, z, true, 64);
            if (acb_is_finite(v) && exactly_there) fail_at("called analytic", places[k].f, z);
            tape_jet(jet, t, z, 4, 64);
            bool finite = true;
            for (int j = 0; j < 4; j++) finite = finite && acb_is_finite(jet + j);
            if (finite && exactly_there) fail_at("has a series", places[k].f, z);
        }
        tape_free(t);
    }
    acb_clear(z);
    acb_clear(v);
    _acb_vec_clear(jet, 4);
    tw_engine_free(e);
}

/* Coefficient k times k! is the kth derivative, as the expression room has it. */
static void series_are_derivatives(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    expr *x = expr_symbol(e, "x");
    enum { LENGTH = 5 };
    acb_ptr jet = _acb_vec_init(LENGTH), wide = _acb_vec_init(LENGTH);
    acb_t z, v, box;
    acb_init(z);
    acb_init(v);
    acb_init(box);
    for (size_t k = 0; k < SAMPLES; k++) {
        expr *d[LENGTH];
        tape *t[LENGTH];
        d[0] = text_parse(e, samples[k].f);
        bool has = true;
        for (int j = 0; j < LENGTH; j++) {
            if (j) d[j] = has ? expr_derivative(e, d[j - 1], x) : NULL;
            has = has && d[j];
            t[j] = has ? tape_new(e, d[j], &x, 1) : NULL;
            has = has && t[j];
            engine_forgive(e);
        }
        for (int trial = 0; trial < 8; trial++) {
            bool real = trial % 2;
            double re = random_real(samples[k].from, samples[k].to), im = real ? 0 : random_real(-1, 1),
                   r = ldexp(1, -4 - (int)random_below(20));
            acb_set_d_d(z, re, im);
            box_set(box, re, im, r, real);
            point_in(z, box);
            tape_jet(jet, t[0], z, LENGTH, 128);
            tape_jet(wide, t[0], box, LENGTH, 64);
            double factorial = 1;
            for (int j = 0; j < LENGTH; j++) {
                if (acb_is_finite(wide + j) && acb_is_finite(jet + j) && !acb_overlaps(wide + j, jet + j))
                    fail_at("the series on a ball misses that of a point", samples[k].f, box);
                if (real && !(acb_is_finite(jet + j) && acb_is_real(jet + j)))
                    fail_at("no real series", samples[k].f, z);
                if (j) factorial *= j;
                if (!t[j]) continue;
                tape_eval(v, t[j], z, true, 128);
                if (!acb_is_finite(v)) continue;
                acb_mul_ui(jet + j, jet + j, (ulong)factorial, 128);
                if (acb_is_finite(jet + j) && !acb_overlaps(v, jet + j))
                    fail_at("series and derivative differ", samples[k].f, z);
                if (real && acb_rel_accuracy_bits(v) > 90 && acb_rel_accuracy_bits(jet + j) < 50)
                    fail_at("few bits in the series", samples[k].f, z);
            }
        }
        for (int j = 0; j < LENGTH; j++) tape_free(t[j]);
    }
    acb_clear(z);
    acb_clear(v);
    acb_clear(box);
    _acb_vec_clear(jet, LENGTH);
    _acb_vec_clear(wide, LENGTH);
    tw_engine_free(e);
}

/* The sign survives on wide real balls. */
static void wide_balls_keep_their_sign(void **state)
{
    (void)state;
    tw_engine *e = text_engine(NULL, LARGE_NONE);
    static const char *const positive[] = {"x^2",
                                           "x^(3/2)",
                                           "1/x",
                                           "x^2*(1 + x)",
                                           "x/(1 + x)",
                                           "exp(x)",
                                           "exp(-x)",
                                           "log(1 + x)",
                                           "sinh(x)",
                                           "tanh(x)",
                                           "atan(x)",
                                           "cosh(x) - 1",
                                           "sqrt(1 + x) - 1",
                                           "exp(x) - 1",
                                           "erf(x)",
                                           "x*sqrt(x)*(x + x^3)"};
    acb_t z, v;
    acb_ptr jet = _acb_vec_init(1);
    acb_init(z);
    acb_init(v);
    box_set(z, 4.25, 0, 4, true);
    for (size_t k = 0; k < sizeof positive / sizeof *positive; k++) {
        tape *t = tape_of(e, text_parse(e, positive[k]), expr_symbol(e, "x"));
        tape_eval(v, t, z, false, 64);
        if (!acb_is_real(v) || !arb_is_positive(acb_realref(v))) fail_at("not seen to be positive", positive[k], z);
        tape_free(t);
    }
    _acb_vec_clear(jet, 1);
    acb_clear(z);
    acb_clear(v);
    tw_engine_free(e);
}

int main(void)
{
    random_seed("test_functions");
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(known_values),
        cmocka_unit_test(enclosures),
        cmocka_unit_test(analytic_means_analytic),
        cmocka_unit_test(no_value_where_none_is),
        cmocka_unit_test(series_are_derivatives),
        cmocka_unit_test(wide_balls_keep_their_sign),
    };
    return cmocka_run_group_tests_name("test_functions", tests, NULL, NULL);
}
