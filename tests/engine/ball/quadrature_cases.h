/* The integrals of the table that quadrature must master, shared by the test and the measurement. At s = 5, 100, 10^4, 10^6. */
#ifndef QUADRATURE_CASES_H
#define QUADRATURE_CASES_H

static const char *const quadrature_integrals[] = {
    "integral from 0 to inf of exp(-s*x)/sqrt(1+x^2) dx",
    "integral from 0 to inf of x^(-2/3)*exp(-s*x)/(1+x) dx",
    "integral from 0 to inf of exp(-s*x)*log(x)/(1+x) dx",
    "integral from 0 to inf of exp(-s*(x-log(x))) dx",
    "integral from -inf to inf of exp(-s*(x^2/2+x^4/4))/(1+x^2) dx",
    "integral from 0 to inf of exp(-s*cosh(x)) dx",
    "integral from 0 to inf of exp(-s*x)/((20*x-1)^2+1) dx",
};
static const char *const quadrature_parameters[] = {"5", "100", "10000", "1000000"};
enum {
    QUADRATURE_INTEGRALS = sizeof quadrature_integrals / sizeof *quadrature_integrals,
    QUADRATURE_PARAMETERS = sizeof quadrature_parameters / sizeof *quadrature_parameters
};

#endif
