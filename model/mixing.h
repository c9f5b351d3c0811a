/* mixing: eddy diffusion of a whole column, species by species, with what crosses the ground and the
 * tropopause booked.
 *
 * Species that share a ground condition share a factorisation. Held species (water, OH, NO2) are carried from
 * their highest prescribed layer up: water falls a thousandfold within the troposphere, and letting it
 * diffuse there between two moments of being set right would wet the stratosphere.
 */
#ifndef SKYMEND_MIXING_H
#define SKYMEND_MIXING_H

#include "conditions.h"

#define MIXING_SLOTS 10 /* step lengths that can be kept ready at once */

typedef struct Mixing Mixing;

/* The model must outlive it. Owner: caller. */
int mixing_make(Mixing **made, const Model *model, int threads, Fault *fault);
void mixing_free(Mixing *mixing);

/* Take over which gases the ground keeps (Conditions.kept); at making, as the base conditions have it. */
void mixing_follow(Mixing *mixing, const Conditions *conditions);
/* Make slot ready for steps of a length in s; nothing is done when it is. */
int mixing_prepare(Mixing *mixing, int slot, double step, Fault *fault);
/* One step of the length slot is ready for. sink: as in diffusion_step, [solved][padded], or NULL. Padding
 * lanes repeat the top layer afterwards. */
void mixing_step(Mixing *mixing, int slot, Column *column, const double *sink);
/* What transport does to the mole fraction of species s at x [solved][padded]: rate [padded] out, s-1; 0 in
 * padding lanes, and to be masked by mixing_mask. */
void mixing_tendency(const Mixing *mixing, const double *x, int s, double *rate);
/* Set rate [solved][padded] to 0 where transport does not change a mole fraction: of species that are not
 * carried, in layers where they are prescribed, and in the lowest layer of those the ground keeps at a value.
 */
void mixing_mask(const Mixing *mixing, double *rate);

/* Give the lowest layer its scheduled (at decimal year time) or fixed values, of gases that the ground keeps;
 * what that adds has come through the ground. */
void mixing_set_ground(const Mixing *mixing, Column *column, double time);

#endif
