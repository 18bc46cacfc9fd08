/* The table behind `help`: every word of the language, what it means, and an example that a test runs. A word of a later
 * version stands here like the others, with `false` in its row: the parser reads it, the session answers that it cannot do
 * it. One table, so lookup, list, completion and tests agree. */
#include "lang/help.h"

/* The integral of several examples. */
#define FADE "large s\nlet Fade = integral from 0 to inf of exp(-s*x)/sqrt(1 + x^2) dx\n"

#define LATER false
#define HERE true

static const help_entry entries[] = {
    /* ---- declarations ---- */
    {"large", HELP_DECLARE, HERE,
     "large NAME\nlarge NAME, arg(NAME) in (A, B)\nlarge NAME integer",
     "Declares the parameter that grows to +inf; expansions are in its powers.\nIt is real and positive from then on. A later "
     "declaration replaces it.",
     "large s\nexpand integral from 0 to inf of exp(-s*x)*cosh(x) dx to 4 terms", NULL},
    {"small", HELP_DECLARE, HERE, "small NAME",
     "Declares a parameter that goes to 0 from above; expansions are in powers\nof it.",
     "small h\nexpand integral from 0 to inf of exp(-x/h)/(2 + x) dx to 4 terms", NULL},
    {"given", HELP_DECLARE, HERE, "given CONDITION, ...\ngiven NAME integer\ngiven NAME complex\ngiven NAME real",
     "States what is known of the parameters. Conditions are decided from these\nfacts; one that contradicts them is an error.",
     "given a > 0, nu > -1/2, 0 < p < 1, n integer, theta in (-pi/4, pi/4]", NULL},
    {"grant", HELP_DECLARE, HERE, "grant CONDITION",
     "Takes a condition as true from here on without proof. A result that needs\nit is `conditional` and lists it as granted.",
     "grant b > 2", NULL},
    {"let", HELP_DECLARE, HERE, "let NAME = EXPRESSION\nlet NAME(x, y) = EXPRESSION\nlet NAME = REQUEST",
     "Names a value, a function, or what a request gives. Names in it are\nresolved now: a later `let` changes nothing earlier.\nSums, products, quotients, rational powers, logarithms and the derivative\nof expansions are expansions again: let L = log(A), let R = A/B.",
     "large s\nlet tilt(u) = 1/(1 + u)^2\nlet F = integral from 0 to inf of exp(-s*x)*tilt(3*x) dx\n"
     "let A = expand F to 6 terms\nlet L = log(A)\nevaluate L at s = 50", NULL},
    {"use", HELP_DECLARE, HERE, "use NAME\nuse \"FILE\"",
     "Runs a file: NAME is one of the standard library, \"FILE\" is looked for\nbeside the file that names it.",
     "use moments\nevaluate exponential_moment(3, 2)", NULL},

    /* ---- requests ---- */
    {"expand", HELP_REQUEST, HERE, "expand INTEGRAL to N terms [by METHOD] [as NAME]",
     "Expands the integral in powers of the large parameter: N nonzero terms of\neach contribution, with exact coefficients. "
     "Without `by` the engine\nchooses the method and says why. METHOD: parts, moments, watson.",
     "large s\nlet F = integral from 0 to inf of exp(-s*x)*sqrt(1 + 4*x) dx\nexpand F to 5 terms by watson as A\nsteps A",
     NULL},
    {"steps", HELP_REQUEST, HERE, "steps NAME\nsteps",
     "Shows a derivation, of an expansion or by hand, step by step (without a name\nthe open one): the rule and its\nsource, the form after it, the conditions, and the "
     "exact remainder where\nterms were split off.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 4 terms\nsteps A", NULL},
    {"coefficients", HELP_REQUEST, HERE, "coefficients of NAME [from N to M]",
     "Lists exact coefficients, a table for each lane. `from N to M` picks their\nnumbers, and computes more when M lies beyond "
     "the known ones.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 4 terms\ncoefficients of A from 2 to 6",
     NULL},
    {"recurrence", HELP_REQUEST, HERE,
     "recurrence of NAME\ncheck recurrence of NAME\ncheck recurrence c[n+1] = (n + 1)*c[n] of NAME",
     "A recurrence for the coefficients c[n] of each lane, its order, its degree,\nfor which n it holds and the first values "
     "that it starts from. `proved`: it\nfollows from an identity between rational functions, the certificate. `check\n"
     "recurrence` proves that identity anew by another way and compares with\ncoefficients computed directly; a typed "
     "recurrence is compared, and proved\nwhen it follows from the proved one.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 4 terms\nrecurrence of A\n"
     "check recurrence of A\ncheck recurrence c[n+1] = -2*(n + 1)*(2*n + 1)*c[n] of A", NULL},
    {"growth", HELP_REQUEST, HERE, "growth of NAME",
     "The form of the coefficients for large n, K*Gamma(m*n + b)/F^n. F and b are\nexact, from the recurrence; K is exact where "
     "the recurrence has order one,\notherwise `estimated` from coefficients far out, with its spread. With it:\nnear which n "
     "the terms are least, and how small the error can become.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 4 terms\ngrowth of A", NULL},
    {"remainder", HELP_REQUEST, HERE, "remainder of NAME [with M terms]",
     "A bound for the integral minus the kept terms, as a formula that holds for\nall values of the large parameter from some "
     "value on, with the theorem or\ncomputation behind it.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\nremainder of A with 3 terms", NULL},
    {"evaluate", HELP_REQUEST, HERE,
     "evaluate NAME at s = 20 [, nu = 1/3] [to D digits] [with M terms]\n"
     "              [with all contributions] [to \"FILE\"]\nevaluate NAME at points of \"FILE\" [to \"FILE\"]\n"
     "evaluate EXPRESSION [at s = 20] [to D digits]",
     "A number with its error bound. Of an expansion: the dominant contributions\nare summed up to the term with the least "
     "bound, or M terms. Of an integral\nor another expression: certified quadrature. Several values after `=` give\na row "
     "each, on the terminal or as CSV in a file.",
     "large s\nlet F = integral from 0 to inf of exp(-s*x)/(1 + x^2) dx\nlet A = expand F to 12 terms\n"
     "evaluate A at s = 20\nevaluate F at s = 20, 40 to 30 digits", NULL},
    {"compare", HELP_REQUEST, HERE, "compare NAME at s = 3, 10, 30 [, nu = 1/3]",
     "Partial sums of an expansion beside certified quadrature: the true error,\nits bound, and how many times wider the bound "
     "is. A proved bound that the\nvalue contradicts ends with exit status 3.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\ncompare A at s = 10", NULL},
    {"plan", HELP_REQUEST, LATER, "plan NAME for relative error 1e-8 [over s from 5 to 100]",
     "From which value of the large parameter on how many terms suffice.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\nplan A for relative error 1e-8",
     NULL},

    /* ---- output and the session ---- */
    {"plot", HELP_WRITE, LATER, "plot error of NAME at s = 3, 10 to \"FILE\"\nplot terms of NAME at s = 10 to \"FILE\"",
     "Draws the error or the terms of an expansion.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\n"
     "plot terms of A at s = 10 to \"terms.svg\"", NULL},
    {"write", HELP_WRITE, HERE, "write NAME as FORMAT to \"FILE\"",
     "Writes an expansion to a file, whole or not at all. FORMAT: json, csv, text.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\n"
     "write A as csv to \"coefficients.csv\"", NULL},
    {"show", HELP_WRITE, HERE, "show NAME", "Shows what a name stands for, all of it; of a parameter, what is known.",
     "given a > 0\nlet g = exp(-a*x)/(1 + x)^3\nshow g\nshow a", NULL},
    {"drop", HELP_WRITE, HERE, "drop NAME", "Forgets a name; of a parameter, what was declared of it.",
     "let g = 1 + x\ndrop g", NULL},
    {"help", HELP_WRITE, HERE, "help [WORD]", "Explains a word of the language, a function, or lists all of them.",
     "help expand", NULL},
    {"quit", HELP_WRITE, HERE, "quit", "Ends the session.", "quit", NULL},

    /* ---- rules and derivations ---- */
    {"rule", HELP_RULE, HERE, "rule NAME(VARIABLES):\n    PATTERN\n    becomes REPLACEMENT\n    when CONDITIONS\n    because "
     "\"SOURCE\"",
     "Defines a rewriting rule. The names in its brackets are pattern variables,\nf(x) there is a pattern function; all else "
     "stands for itself. Sums and\nproducts match in any order. Before its first use a rule is tried at\nrandom admissible "
     "values; one that fails is refuted and never used.",
     "rule halve(a):\n    integral from 0 to inf of exp(-2*a*x) dx\n    becomes 1/(2*a) when a > 0\n\n"
     "rewrite integral from 0 to inf of exp(-6*t) dt with halve", NULL},
    {"pass", HELP_RULE, HERE, "pass NAME = RULE\npass NAME = PASS then PASS\npass NAME = PASS or PASS\npass NAME = repeat PASS\n"
     "pass NAME = everywhere PASS\npass NAME = once PASS",
     "Combines rules. `repeat`, `everywhere`, `once` bind tightest, then `then`,\nthen `or`. A `repeat` that goes in a circle "
     "is an error that shows it.",
     "rule add_angles(a): 2*sin(a)*cos(a) becomes sin(2*a) because \"DLMF 4.21.27\"\n"
     "pass tidy = repeat everywhere add_angles\nrewrite 8*sin(x)*cos(x)*cos(2*x) with tidy", NULL},
    {"check", HELP_RULE, HERE, "check rule NAME\ncheck \"FILE\"\ncheck recurrence of NAME",
     "Tries a rule, or every rule of a file, at random admissible values: both\nsides as certified balls. One disjoint pair "
     "refutes it, and is shown.",
     "rule shift(a): Gamma(a + 1) becomes a*Gamma(a) because \"DLMF 5.5.1\"\ncheck rule shift", NULL},
    {"rewrite", HELP_RULE, HERE, "rewrite EXPRESSION with PASS", "Applies a pass to an expression. The result says what it rests "
     "on.",
     "rule sum_of_squares(x): sin(x)^2 + cos(x)^2 becomes 1\nrewrite sin(3*t)^2 + 5 + cos(3*t)^2 with sum_of_squares", NULL},
    {"why", HELP_RULE, HERE, "why not RULE", "Says why a rule does not apply to the expression rewritten last (in a\n"
     "derivation: to the current form): which part found nothing at the nearest\nplace, or which condition, and what is known of "
     "it.",
     "rule halve(a):\n    integral from 0 to inf of exp(-2*a*x) dx\n    becomes 1/(2*a) when a > 0\n\n"
     "rewrite integral from 0 to inf of exp(-k*t) dt with halve\nwhy not halve", NULL},
    {"derive", HELP_RULE, HERE, "derive INTEGRAL\n    MOVES\ndone [as NAME]",
     "Opens a derivation by hand. Each line until `done` is a move on the current\nform; it is checked, by its theorem and by "
     "certified balls at sample values\nof the parameters, before it is kept. `undo` takes the last one back,\n`steps` shows the "
     "way so far, `show` the form with what it rests on.",
     FADE "derive Fade\n    substitute x = t/s\n    parts integrating exp(-t)\n    repeat parts 3 times\ndone as D\n"
     "let A = expansion of D\nevaluate A at s = 10", NULL},
    {"done", HELP_RULE, HERE, "done [as NAME]",
     "Ends the open derivation; with a name it is kept: `steps`, `show`, `replay`,\n`expansion of`, `rule from` and `write` take "
     "it.",
     FADE "derive Fade\n    parts integrating exp(-s*x)\ndone as D\nsteps D", NULL},
    {"undo", HELP_RULE, HERE, "undo", "Takes the last move of the open derivation back.",
     FADE "derive Fade\n    parts integrating exp(-s*x)\n    undo\n    substitute x = t/s\ndone", NULL},
    {"replay", HELP_RULE, HERE, "replay NAME on INTEGRAL\nlet NEW = replay NAME on INTEGRAL",
     "Runs the moves of a kept derivation on another integral of the same shape;\neach move is checked again there.",
     FADE "derive Fade\n    parts integrating exp(-s*x)\n    repeat parts 2 times\ndone as D\n"
     "let G = integral from 0 to inf of exp(-s*y)/(2 + y)^3 dy\nlet E = replay D on G\nlet B = expansion of E", NULL},

    /* ---- moves ---- */
    {"substitute", HELP_MOVE, HERE, "substitute VAR = EXPR [with NEW = INVERSE] [in integral K]",
     "Changes the variable of integration; the new variable is the one name in\nEXPR that is not yet known. The change must be "
     "monotone, and run through\nthe whole range. Where the inverse is not found it has to be said.",
     FADE "derive Fade\n    substitute x = sinh(u)\ndone", NULL},
    {"parts", HELP_MOVE, HERE, "parts integrating FACTOR [in integral K]",
     "Integrates by parts: FACTOR is integrated, what is left of the integrand\ndifferentiated. An antiderivative of FACTOR must "
     "be found, and the boundary\nterms must be finite.",
     "given a > 0, n > 0\nderive integral from 0 to inf of x^n*exp(-a*x) dx\n    parts integrating exp(-a*x)\ndone", NULL},
    {"repeat", HELP_MOVE, HERE, "repeat parts N times",
     "Integrates by parts again, N times: the antiderivative of the last time is\nintegrated on.",
     FADE "derive Fade\n    parts integrating exp(-s*x)\n    repeat parts 3 times\ndone", NULL},
    {"differentiate", HELP_MOVE, HERE, "differentiate in PARAM",
     "Differentiates the form in a parameter, under the integral sign. From then\non the form is the derivative of what it was; "
     "`integrate back` undoes that.",
     "given a > 0, b > 0\nderive integral from 0 to inf of exp(-a*x)*sin(b*x)/x dx\n    differentiate in b\n    integrate "
     "termwise\n    integrate back in b from 0\ndone", NULL},
    {"integrate", HELP_MOVE, HERE, "integrate termwise [in integral K]\nintegrate back in PARAM from VALUE",
     "Termwise: multiplies the integrand out and integrates each term that has a\nknown integral; where none has, each gets an integral of its own. Back: from\nthe value of PARAM "
     "at which the integral is known, over the derivative that\nthe form is, to PARAM; VALUE may be inf.",
     "given a > 0\nderive integral from 0 to inf of (1 + x)^2*exp(-a*x) dx\n    integrate termwise\ndone", NULL},
    {"split", HELP_MOVE, HERE, "split at POINT [in integral K]",
     "Splits an integral in two at a point inside its range. After it a move acts\non every integral that it fits; `in integral "
     "K` picks one.",
     FADE "derive Fade\n    split at 1\n    substitute x = 1 + y in integral 2\ndone", NULL},
    {"rotate", HELP_MOVE, HERE, "rotate by ANGLE [in integral K]",
     "Turns the path of an integral from 0 to inf by an angle in the complex\nplane, a rational multiple of pi. The arcs must be "
     "seen to vanish and the\nsector to hold no singularity; else this stays an open condition.",
     "large s\nderive integral from 0 to inf of exp(i*s*x)/(1 + x) dx\n    rotate by pi/2\ndone", NULL},
    {"expand", HELP_MOVE, HERE, "expand FACTOR around POINT to N terms [in integral K]",
     "In a derivation: puts the first N terms of FACTOR's series in its place.\nThe rest stays as an exact integral, the "
     "remainder.",
     FADE "derive Fade\n    expand 1/sqrt(1 + x^2) around 0 to 4 terms\n    integrate termwise\ndone", NULL},
    {"swap", HELP_MOVE, HERE, "swap [in integral K]",
     "Changes the order of two integrations over a rectangle. Absolute convergence\nis proved, or stays an open condition.",
     "given a > 0\nderive integral from 0 to inf of\n  integral from 0 to 1 of exp(-a*x)*y^2/(1 + x) dy dx\n    swap\ndone", NULL},

    /* ---- expressions ---- */
    {"integral", HELP_EXPRESSION, HERE, "integral from A to B of BODY dx\nintegral along P to Q to R of BODY dz",
     "An integral; the word made of d and a name says which variable and closes\nit. An empty body is written 1. Along a "
     "path the legs are straight.",
     "evaluate integral from 0 to 2 of exp(-x^2) dx to 20 digits", NULL},
    {"sum", HELP_EXPRESSION, HERE, "sum from k = A to B of BODY",
     "A sum; BODY is one product: it ends before + - a comparison or a comma.", "evaluate sum from k = 1 to 20 of 1/k^2",
     NULL},
    {"derivative", HELP_EXPRESSION, HERE, "derivative of F in x [order N]",
     "The derivative of a product; a sum needs brackets.", "let g = derivative of (x^3*exp(-x)) in x order 2", NULL},
    {"piecewise", HELP_EXPRESSION, HERE, "piecewise(VALUE when CONDITION, ..., VALUE otherwise)",
     "A function given in pieces; the first condition that holds counts.",
     "let ramp = piecewise(x when x < 1, 1 otherwise)", NULL},
    {"root", HELP_EXPRESSION, HERE, "root of POLYNOMIAL in r near VALUE",
     "An algebraic number: the root of the polynomial nearest to the value.",
     "let plastic = root of r^3 - r - 1 in r near 1.3247", NULL},
    {"at", HELP_EXPRESSION, HERE, "(EXPRESSION at x = 3, y = 2)",
     "Substitution; the bindings are simultaneous and the brackets are needed.\nIn evaluate and compare it gives the values of "
     "the parameters.",
     "let g = (x*y^2 at x = y, y = 3)", NULL},

    /* ---- constants ---- */
    {"pi", HELP_CONSTANT, HERE, "pi", "The ratio of circumference and diameter of a circle.", "evaluate pi to 30 digits", NULL},
    {"i", HELP_CONSTANT, HERE, "i", "The imaginary unit.", "evaluate exp(i*pi/3)", NULL},
    {"inf", HELP_CONSTANT, HERE, "inf\ninf(theta)",
     "Infinity, as an end of an integral or an interval; inf(theta) lies in the\ndirection of the angle theta.",
     "evaluate integral from -inf to inf of exp(-x^2) dx", NULL},
    {"euler_constant", HELP_CONSTANT, HERE, "euler_constant", "Euler's constant, -psi(1) = 0.5772... (DLMF 5.2.3).",
     "evaluate euler_constant to 30 digits", NULL},

    /* ---- methods ---- */
    {"watson", HELP_METHOD, HERE, "expand INTEGRAL to N terms by watson",
     "Watson's lemma (DLMF 2.3(ii)): kernels exp(-c*s*x^mu); powers of x, log(x)\nand other parameters in the rest.",
     "large s\nlet F = integral from 0 to inf of exp(-s*x)*x^(-1/3)/(1 + x^2) dx\nexpand F to 4 terms by watson", NULL},
    {"parts", HELP_METHOD, HERE, "expand INTEGRAL to N terms by parts",
     "Repeated integration by parts (DLMF 2.3(i)): the slope of the exponent is\nnot zero on the path. The remainder stays an "
     "exact integral.",
     "large s\nlet F = integral from 0 to 1 of exp(-s*(x + x^2))*cos(x) dx\nexpand F to 4 terms by parts", NULL},
    {"moments", HELP_METHOD, HERE, "expand INTEGRAL to N terms by moments",
     "Families known in closed form by differentiating in a parameter; the\nexpansion ends by itself and is exact.",
     "large s\nexpand integral from 0 to inf of x^3*exp(-s*x) dx to 4 terms by moments", NULL},
    {"laplace", HELP_METHOD, HERE, "expand INTEGRAL to N terms by laplace",
     "Laplace's method (DLMF 2.3(iii)): a real exponent, greatest at an end,\ninside, or at several points of equal depth; "
     "kinks, powers f(x)^s, and\npoints that move with s. Points are exact: rational, algebraic, parameters.",
     "large s\nlet F = integral from -1 to 2 of exp(-s*(x^2 + x^4)) dx\nexpand F to 4 terms by laplace", NULL},
    {"phase", HELP_METHOD, HERE, "expand INTEGRAL to N terms by phase",
     "Stationary phase (DLMF 2.3(iv)): for cos, sin or exp(i ...) of the large\nparameter times a phase. Its ends and stationary points give the terms.",
     "large s\nexpand integral from 0 to 1 of exp(i*s*x^2) dx to 4 terms by phase", NULL},
    {"descent", HELP_METHOD, HERE, "expand INTEGRAL to N terms by descent",
     "Steepest descent (DLMF 2.4(iv)): the path becomes steepest curves through\nsaddles; `steps` prints how often each counts.",
     "large s\nlet F = integral along inf(-pi/4) to inf(pi/4) of exp(s*(z^4 - z)) dz\nexpand F to 4 terms by descent", NULL},
    {"mellin", HELP_METHOD, LATER, "expand INTEGRAL to N terms by mellin", "Mellin transforms (DLMF 2.5).",
     "large s\nexpand integral from 0 to inf of exp(-x)/(1 + s*x) dx to 4 terms by mellin", NULL},

    /* ---- formats ---- */
    {"json", HELP_FORMAT, HERE, "write NAME as json to \"FILE\"",
     "One JSON object with everything: coefficients, remainder, conditions, steps.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\nwrite A as json to \"a.json\"", NULL},
    {"csv", HELP_FORMAT, HERE, "write NAME as csv to \"FILE\"", "One row a coefficient (RFC 4180), with a header.", NULL, "write"},
    {"text", HELP_FORMAT, HERE, "write NAME as text to \"FILE\"", "One coefficient a line, comment lines between the lanes.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\nwrite A as text to \"a.txt\"", NULL},
    {"latex", HELP_FORMAT, LATER, "write NAME as latex to \"FILE\"", "The derivation and the result as LaTeX.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\nwrite A as latex to \"a.tex\"",
     NULL},
    {"c", HELP_FORMAT, LATER, "write NAME as c to \"FILE\"", "A C function that evaluates the expansion.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 6 terms\nwrite A as c to \"a.c\"", NULL},

    /* ---- labels: how a thing is known ---- */
    {"exact", HELP_LABEL, HERE, NULL, "The expansion ends by itself and equals the integral.", NULL, "moments"},
    {"proved", HELP_LABEL, HERE, NULL,
     "Follows from the integral as typed and the given facts alone. A manner may\nfollow: `proved, enclosing`: the remainder "
     "has the sign of the first\nomitted term and is smaller.",
     NULL, "remainder"},
    {"enclosing", HELP_LABEL, HERE, NULL,
     "A manner of `proved`: the remainder has the sign of the first omitted term\nand is smaller.", NULL, "remainder"},
    {"conditional", HELP_LABEL, HERE, NULL, "Rests on an open or granted condition; the result lists them.", NULL, "grant"},
    {"estimated", HELP_LABEL, HERE, NULL, "A figure without proof, from the next omitted terms.", NULL, "evaluate"},
    {"unknown", HELP_LABEL, HERE, NULL, "Nothing is claimed; the reason stands below.", NULL, "remainder"},
    {"fitted", HELP_LABEL, HERE, NULL, "Of a recurrence: agrees with the computed coefficients, not proved.", NULL,
     "recurrence"},
    {"passed", HELP_LABEL, HERE, NULL, "Of a rule: tried at samples without a contradiction.", NULL, "check"},
    {"refuted", HELP_LABEL, HERE, NULL, "Contradicted by certified numbers.", NULL, "compare"},
    {"unchecked", HELP_LABEL, HERE, NULL, "Of a rule: not tried.", NULL, "check"},
    {"granted", HELP_LABEL, HERE, NULL, "Of a condition: taken as true by `grant`.", NULL, "grant"},
    {"open", HELP_LABEL, HERE, NULL, "Of a condition: neither proved nor refuted; what needs it is conditional.", NULL,
     "remainder"},

    /* ---- words inside statements ---- */
    {"from", HELP_CLAUSE, HERE, "from A to B", "The lower limit of an integral or a sum, or the first of a range.", NULL,
     "integral"},
    {"to", HELP_CLAUSE, HERE, NULL, "The upper limit; also `to N terms`, `to D digits`, `to \"FILE\"`.", NULL, "integral"},
    {"of", HELP_CLAUSE, HERE, NULL, "Before what an integral, a sum or a request is taken of.", NULL, "integral"},
    {"along", HELP_CLAUSE, HERE, "integral along P to Q to R of BODY dz",
     "A path of straight legs; its ends may be inf(theta). These meet at 0.",
     "let F = integral along inf(-pi/4) to inf(pi/4) of exp(z^3 - s*z) dz\nevaluate F at s = 5", NULL},
    {"in", HELP_CLAUSE, HERE, "NAME in (A, B]", "A condition: the value lies in the interval.", NULL, "given"},
    {"integer", HELP_CLAUSE, HERE, "given NAME integer", "The parameter is an integer.", NULL, "given"},
    {"real", HELP_CLAUSE, HERE, "given NAME real", "The parameter is real, as every parameter is unless declared.",
     "given x real", NULL},
    {"complex", HELP_CLAUSE, HERE, "given NAME complex", "The parameter is complex.", "given z complex", NULL},
    {"terms", HELP_CLAUSE, HERE, "to N terms\nwith M terms", "How many terms to compute, or to keep.", NULL, "expand"},
    {"digits", HELP_CLAUSE, HERE, "to D digits", "Relative accuracy, in decimal digits.", NULL, "evaluate"},
    {"contributions", HELP_CLAUSE, HERE, "with all contributions",
     "Sums the subdominant contributions, too.", NULL, "evaluate"},
    {"with", HELP_CLAUSE, HERE, "with M terms\nwith all contributions", "What to keep of an expansion.", NULL, "remainder"},
    {"by", HELP_CLAUSE, HERE, "by METHOD", "The method to use.", NULL, "expand"},
    {"as", HELP_CLAUSE, HERE, "as NAME\nas FORMAT", "The name under which to keep it; the format of a file.", NULL, "expand"},
    {"when", HELP_CLAUSE, HERE, NULL, "A condition, of a piece or of a rule.", NULL, "piecewise"},
    {"otherwise", HELP_CLAUSE, HERE, NULL, "The last piece.", NULL, "piecewise"},
    {"near", HELP_CLAUSE, HERE, NULL, "The value next to a root.", NULL, "root"},
    {"order", HELP_CLAUSE, HERE, NULL, "How many times to differentiate.", NULL, "derivative"},
    {"step", HELP_CLAUSE, HERE, "at NAME from A to B step C", "Equal steps from the first value on.",
     "large s\nlet F = integral from 0 to inf of exp(-s*x)/(1 + x^2) dx\nevaluate F at s from 10 to 30 step 5", NULL},
    {"points", HELP_CLAUSE, HERE, "at NAME from A to B in N points [on a log scale]\nat points of \"FILE\"",
     "So many values, equally spaced (on a log scale: rounded to 10 digits). Or\nthe rows of a CSV file: its first line names "
     "the parameters, the cells below\nare their values.",
     "large s\nlet A = expand integral from 0 to inf of exp(-s*x)/(1 + x^2) dx to 8 terms\n"
     "evaluate A at s from 10 to 30 in 3 points\nevaluate A at points of \"points.csv\" to \"out.csv\"", NULL},
    {"on", HELP_CLAUSE, HERE, "on a log scale", "The values grow by equal factors.",
     "large s\nlet F = integral from 0 to inf of exp(-s*x)/(1 + x^2) dx\n"
     "evaluate F at s from 10 to 1000 in 3 points on a log scale",
     NULL},
    {"scale", HELP_CLAUSE, HERE, "on a log scale", "The values grow by equal factors.", NULL, "on"},
    {"all", HELP_CLAUSE, HERE, "with all contributions", "Sums the subdominant contributions, too.", NULL, "evaluate"},
    {"expansion", HELP_CLAUSE, HERE, "let NAME = expansion of DERIVATION",
     "Reads the last form of a kept derivation as an expansion: its terms are\nsummed, the integrals left are the remainder.",
     NULL, "derive"},
    {"for", HELP_CLAUSE, LATER, "plan NAME for relative error 1e-8", "Before what a plan is for.", NULL, "plan"},
    {"relative", HELP_CLAUSE, LATER, "for relative error E", "Error divided by the value.", NULL, "plan"},
    {"error", HELP_CLAUSE, LATER, "plot error of NAME ...", "The integral minus what is summed.", NULL, "plan"},
    {"over", HELP_CLAUSE, LATER, "over NAME from A to B", "The range that a plan covers.", NULL, "plan"},
    {"around", HELP_CLAUSE, HERE, "expand FACTOR around POINT to N terms", "Where a factor is expanded, in a derivation.",
     "derive (integral from 0 to inf of exp(-x)*cos(x/4) dx)\nexpand cos(x/4) around 0 to 3 terms", NULL},
    {"integrating", HELP_CLAUSE, HERE, "parts integrating FACTOR", "The factor that is integrated.", NULL, "parts"},
    {"times", HELP_CLAUSE, HERE, "repeat parts N times", "How often a move is repeated.", NULL, "repeat"},
    {"back", HELP_CLAUSE, HERE, "integrate back in PARAM from VALUE", "Integrates in a parameter.", NULL, "differentiate"},
    {"termwise", HELP_CLAUSE, HERE, "integrate termwise", "Term by term.", NULL, "integrate"},
    {"not", HELP_CLAUSE, HERE, "why not RULE", "Asks why a rule does not apply.", NULL, "why"},
    {"becomes", HELP_CLAUSE, HERE, NULL, "Between the two sides of a rule.", NULL, "rule"},
    {"because", HELP_CLAUSE, HERE, NULL, "The source of a rule.", NULL, "rule"},
    {"then", HELP_CLAUSE, HERE, NULL, "One after the other, in a pass.", NULL, "pass"},
    {"or", HELP_CLAUSE, HERE, NULL, "The first that applies, in a pass.", NULL, "pass"},
    {"everywhere", HELP_CLAUSE, HERE, NULL, "At every place where it applies, in a pass.", NULL, "pass"},
    {"once", HELP_CLAUSE, HERE, NULL, "At the first place where it applies, in a pass.", NULL, "pass"},
};

const help_entry *help_table(size_t *count)
{
    *count = sizeof entries / sizeof *entries;
    return entries;
}
