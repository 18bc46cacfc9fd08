#include "engine/ball/quadrature.h"
tw_status quadrature(tw_engine *e, acb_t value, expr *f, const env *at, slong digits, bool accept_less,
                     quadrature_report *report) { (void)value;(void)f;(void)at;(void)digits;(void)accept_less;(void)report; return engine_fail(e, ERROR_UNDECIDED,"x");}
