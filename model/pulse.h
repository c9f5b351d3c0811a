/* pulse: when the effect of a gas given off falls.
 *
 * The settled column, linear about its state: d(dx)/dt = A dx, with dx(0) one molecule cm-2 of the gas more
 * in the lowest layer, diurnal factors as they are, the gas driven by its flux and all others as their
 * grounds have it. With c the weight of each layer's ozone in the column and l = A'^-1 c (one adjoint solve),
 * the integral of c dx from t on is -l dx(t), so that
 *
 *     fallen(t) = 1 - l dx(t) / l dx(0)
 *
 * of all the effect has fallen after t, from nothing to 1 with the gas's way up, its lifetime and the stay of
 * what it leaves. Through time by the two-stage L-stable SDIRK (Alexander 1977) at a fixed step, whose one
 * matrix serves every step.
 */
#ifndef SKYMEND_PULSE_H
#define SKYMEND_PULSE_H

#include "unsplit.h"

/* unsplit at rest at x [solved][padded], with its factors; light by the slopes, made here. fallen [steps + 1]
 * out, every `step` years from 0. The gas s is one whose value the ground keeps. unsplit is left as it was
 * but for its matrix and slopes. FAULT_NUMERICS when the gas does nothing to the column. */
int pulse_response(Unsplit *unsplit, const double *x, int s, int steps, double step, double *fallen,
                   Fault *fault);

#endif
