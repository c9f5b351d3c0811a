/* stepper: what the rooms of the step share; private to stepper.c, step.c and step_day.c. */
#ifndef SKYMEND_STEPPER_H
#define SKYMEND_STEPPER_H

#include "mixing.h"
#include "step.h"

typedef struct {
    int result, where; /* of the solver */
    SolverCounts counts;
    PackLedger ledger;
} PackOutcome;

struct Stepper {
    const Model *model;
    Conditions *conditions; /* of now */
    double spun;            /* years spent with the clock standing still: the seasons go on */
    int threads, packs;
    Mixing *mixing; /* slot 0: the step of a run of means; the others: borders of parts of the day with their
                       mirror images */
    Light *light;
    Day *day;
    Moments *moments;
    Column *sample;       /* the column of the explicit days that give the factors; its ledger is nobody's */
    PackWork **work;      /* [threads] */
    PackOutcome *outcome; /* [packs] */
    int *order; /* [2 + PACK_DAY_PARTS][packs] packs by the work they were last time, most first: threads end
                   together */
    double *ledgers;     /* [packs][held + solved + tallies], behind outcome[].ledger */
    double *half_step;   /* [2][packs] solver step to try first: before the transport, after it */
    double *part_step;   /* [PACK_DAY_PARTS][packs] the same for the parts of the day */
    double *coefficient; /* [reactions][padded] */
    double *density;     /* [solved][padded] work */
    double *mean;        /* [solved][padded] */
    int balances;        /* species with a balance */
    int *balanced;       /* [balances] which */
    double *turn;        /* [balances][padded] running sum for the balance of a step */
    double *made, *lost; /* [solved][padded] by the chemistry at the end of a step, mole fraction s-1 */
    double *daylight;    /* [solved][padded] explicit days: mean of the last day while the sun was up */
    int daylight_known;
    double
        *given; /* [solved][padded] what emissions give, mole fraction s-1; 0 where a value is prescribed */
    double *flux, *absorbed; /* [solved] all they give, and the part that falls where a value is prescribed,
                                molecules cm-2 s-1 */
    int giving;              /* 1: some line gives off something now */
    unsigned char *reacts;   /* [solved] 1: in a run of means emissions of it come with the chemistry */
    double *sink;            /* [solved][padded] work */
    double since_factors;    /* s of the run since the diurnal factors were made */
    RefreshLog *kept_log;    /* NULL, or where to note what each step makes afresh */
    const RefreshLog *followed_log; /* NULL, or whose moments to follow */
    long logged;                    /* steps since the log began */
    StepClock clock;
};

/* ---- stepper.c ---- */

/* Coefficients that hang on temperature and air. */
void stepper_thermal(Stepper *stepper);
/* Bring the conditions to decimal year time, and what is made of them. season: as in conditions_move. */
void stepper_move(Stepper *stepper, double time, double season);
/* Coefficients that hang on species of their own layer. */
void stepper_local_coefficients(Stepper *stepper, const Column *column);
/* Transport with the emissions of now, booked. slot: made ready for steps of length s. balance: that of a run
 * of means, in which what stepper_source gives is only booked; NULL: the explicit day, whose parts are short.
 */
void stepper_mix(Stepper *stepper, Column *column, int slot, double length, const double *balance);
/* What the chemistry of a run of means gets from outside: Column.balance, and the emissions of species that
 * reactions make and no ground takes up. Such a gas (NO) may be turned over within minutes; let in by the
 * transport it would be carried for a whole step before anything turns it into something else. A gas that no
 * reaction makes comes with the transport that takes it up from the ground. Mole fraction s-1,
 * [solved][padded]; good until the next call of this or stepper_mix. */
const double *stepper_source(Stepper *stepper, const Column *column);
/* Photolysis rates made afresh where they are stale. */
void stepper_follow_light(Stepper *stepper, Column *column);

/* ---- step.c ---- */

Tolerance stepper_tolerance(const Model *model);
/* Packs in the order of their work, most first. */
void stepper_arrange(const Stepper *stepper, int *order);
/* After the packs: sums in their order, or the first fault. */
int stepper_settle_packs(Stepper *stepper, Column *column, Fault *fault);

/* ---- step_day.c ---- */

/* From midnight to midnight. Leaves the time integrals in stepper->day. years: what the schedule's clock
 * moves by. */
int stepper_carry_day(Stepper *stepper, Column *column, double years, Fault *fault);
/* Repeat the day of the column's state until no factor that matters changes by more than enough of itself, or
 * where exactly is above 0, that many times. */
int stepper_repeat_day(Stepper *stepper, Column *column, double enough, int exactly, Fault *fault);
/* Whether factors are to be made afresh by the thresholds of the case, or of one who follows a log. */
int stepper_day_due(const Stepper *stepper, const Column *column);
/* Factors made afresh where they are stale. */
int stepper_follow_day(Stepper *stepper, Column *column, Fault *fault);

#endif
