/* The one place that knows which FLINT this is. Debian 12 has FLINT 2.9 with Arb 2.23, ANTIC and Calcium 0.4 as
 * separate libraries; from FLINT 3 on they are one. Every other file includes this header and no FLINT header.
 *
 * FLINT reports trouble it cannot return (out of memory, a division by zero that nobody checked) through a process-wide
 * abort hook. flint.c installs one that jumps to the edge that engine_protect() has set up on this thread. The host's
 * GMP allocators are never replaced unless it asks for it. */
#ifndef TW_BASE_FLINT_H
#define TW_BASE_FLINT_H

/* FLINT's numbers are arrays of one element; where such a member stands first in a struct, gcc 12 and 13 take its size
 * for that of its own first member and warn of reads beyond it. */
#if defined(__GNUC__) && !defined(__clang__)
#pragma GCC diagnostic ignored "-Wstringop-overread"
#pragma GCC diagnostic ignored "-Wstringop-overflow"
#endif

#include <flint/flint.h>
#include <flint/ulong_extras.h>
#include <flint/fmpz.h>
#include <flint/fmpz_vec.h>
#include <flint/fmpz_factor.h>
#include <flint/fmpz_poly.h>
#include <flint/fmpz_poly_factor.h>
#include <flint/fmpz_mpoly.h>
#include <flint/fmpz_mpoly_factor.h>
#include <flint/fmpq.h>
#include <flint/fmpq_poly.h>
#include <flint/fmpq_vec.h>

#if __FLINT_RELEASE >= 30000
#include <flint/bernoulli.h>
#include <flint/arb.h>
#include <flint/arb_poly.h>
#include <flint/arb_hypgeom.h>
#include <flint/arb_fmpz_poly.h>
#include <flint/acb.h>
#include <flint/acb_poly.h>
#include <flint/acb_calc.h>
#include <flint/acb_hypgeom.h>
#include <flint/acb_dirichlet.h>
#include <flint/fmpz_mpoly_q.h>
#include <flint/ca.h>
#include <flint/qqbar.h>
#else
#include <bernoulli.h>
#include <arb.h>
#include <arb_poly.h>
#include <arb_hypgeom.h>
#include <arb_fmpz_poly.h>
#include <acb.h>
#include <acb_poly.h>
#include <acb_calc.h>
#include <acb_hypgeom.h>
#include <acb_dirichlet.h>
#include <calcium/fmpz_mpoly_q.h>
#include <calcium/ca.h>
#include <calcium/qqbar.h>
#endif

/* Installs the abort hook; called for each engine, does its work once a process. */
void flint_hook_install(void);

/* For a program that owns its process: GMP and FLINT allocate through the edge from now on, so that a single call of theirs
 * which goes on past the deadline, the memory limit or an interrupt is left at its next allocation, as an error of that
 * kind (what it held is lost). on_abort (or NULL) is called when FLINT gives up, after it has printed its reason on standard
 * output's buffer and before the jump. To be called before FLINT allocates anything. */
void edge_install_allocators(void (*on_abort)(void));

/* Leaves through the innermost edge of this thread as ERROR_MEMORY; ends the process where there is none. */
void edge_leave_memory(void) __attribute__((noreturn));

/* Tests count allocations down (tw_engine.allocations_left): is the next one to fail? Counts it. */
int edge_allocation_fails(void);
/* Are allocations being counted on this thread? Arenas then ask for memory piece by piece. */
int edge_counts_allocations(void);

#endif
