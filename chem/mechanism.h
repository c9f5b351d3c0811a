/* mechanism: species and reactions, read from a libconfig file and checked at load.
 *
 * Immutable once read and shared by all threads. The file's language is described in DEVELOPERS.md; the
 * atoms of every reaction must balance. Species of role "active" are solved: they are numbered
 * 0..solved-1 in file order and called solved species. "fixed" species (N2, O2, M) are shares of air and
 * enter rate coefficients; "inert" ones are products that only balance atoms. Each washed-out
 * species gets a first-order loss (kind REACTION_WASHOUT) appended after the reactions of the file.
 */
#ifndef SKYMEND_MECHANISM_H
#define SKYMEND_MECHANISM_H

#include "../input/fault.h"

#define MECHANISM_NAME 32
#define MECHANISM_ELEMENTS 8
#define MECHANISM_PARAMETERS 8
#define REACTION_CHANGES 12

enum SpeciesRole { ROLE_ACTIVE, ROLE_FIXED, ROLE_INERT };
enum ReactionKind { REACTION_THERMAL, REACTION_PHOTOLYSIS, REACTION_SURFACE, REACTION_WASHOUT };
enum RateLaw {
    LAW_ARRHENIUS,    /* A, ER, n, Tref */
    LAW_TERMOLECULAR, /* as Arrhenius; M is a written reactant */
    LAW_FALLOFF,      /* k0, n0, ki, ni, Tref */
    LAW_ACTIVATED,    /* A, ER, k0, n0, ki, ni, Tref */
    LAW_EQUILIBRIUM,  /* KA, KB; forward reaction in Reaction.forward */
    LAW_HO2_HO2,      /* A1, ER1, A2, ER2, AW, ERW */
    LAW_OH_HNO3,      /* AA, ERA, AB, ERB, AC, ERC */
    LAW_SUM2,         /* A1, ER1, A2, ER2 */
    LAW_NONE          /* photolysis, surface, washout */
};
enum SurfaceModel {
    SURFACE_CONSTANT,
    SURFACE_CLONO2_H2O,
    SURFACE_CLONO2_HCL,
    SURFACE_HOCL_HCL,
    SURFACE_BRONO2_H2O,
    SURFACE_N2O5_H2O,
    SURFACE_NAT_H2O, /* on nitric acid trihydrate, constant probability */
    SURFACE_NAT_HCL
};
enum PhotolysisSpecial { SPECIAL_NONE, SPECIAL_O2, SPECIAL_O2_O1D, SPECIAL_NO };

typedef struct {
    char name[MECHANISM_NAME];
    char formula[MECHANISM_NAME];
    int role;                      /* enum SpeciesRole */
    int atoms[MECHANISM_ELEMENTS]; /* by Mechanism.element */
    double molar_mass;             /* g mol-1, from the formula and IUPAC standard atomic weights */
    double share;                  /* ROLE_FIXED: mole fraction of air */
    double washout;                /* relative first-order washout, 0..1 */
    int transport;                 /* 1 if carried by diffusion */
    int solved;                    /* number among the solved species, -1 otherwise */
} Species;

typedef struct {
    char id[48];
    char *equation;
    int kind;                               /* enum ReactionKind */
    int law;                                /* enum RateLaw */
    double parameter[MECHANISM_PARAMETERS]; /* in the order listed at enum RateLaw */
    double branch;                          /* multiplies the law, 0..1, default 1 */
    int forward;                            /* LAW_EQUILIBRIUM: index of the forward reaction, else -1 */

    /* rate = coefficient * product of the number densities of these solved species */
    int reactants;   /* 0..3, repeats listed repeatedly */
    int reactant[3]; /* solved-species numbers */
    /* product over fixed reactants (M, O2, N2): share1 * M * share2 * M ...; folded into the coefficient */
    int fixed_order;    /* how many fixed reactants */
    double fixed_share; /* product of their shares; 1 when none */

    /* net change of solved species per event; a species that does not change is not listed */
    int changes;
    int changed[REACTION_CHANGES];
    double change[REACTION_CHANGES];

    /* photolysis */
    int special;                   /* enum PhotolysisSpecial */
    char spectrum[MECHANISM_NAME]; /* name of the cross-section table */
    char yield[MECHANISM_NAME];    /* name of the yield table or "" */
    int yield_complement;          /* 1: phi = 1 - table */
    double phi;                    /* constant yield where no table */

    /* surface: first reactant is the one taken up */
    int surface_model; /* enum SurfaceModel */
    double gamma;      /* SURFACE_CONSTANT, SURFACE_NAT_H2O, SURFACE_NAT_HCL */

    double f,
        g; /* published uncertainty factor at 298 K and its temperature term (K); f = 0 when none is given */
    char *source, *basis, *note; /* "" when absent */
    int line;                    /* in the file */
} Reaction;

typedef struct {
    char *path, *title, *version;
    char *citations; /* sources list as text, one a line */
    int elements;
    char element[MECHANISM_ELEMENTS][4];
    int species; /* all, in file order */
    Species *item;
    int solved; /* solved species; solved number s is item[solved_item[s]] */
    int *solved_item;
    int reactions; /* order: thermal, photolysis, surface, washout */
    Reaction *reaction;
    int thermal_first, photolysis_first, surface_first, washout_first; /* starts of the kinds */
} Mechanism;

/* Read and check. Owner: caller. Faults name file and line: syntax, unknown key (nearest suggested), unknown
 * species, unbalanced atoms (which element, left and right counts), duplicate ids or species, unused or
 * missing parameters, over-long equations. */
int mechanism_read(Mechanism **read, const char *path, Fault *fault);
void mechanism_free(Mechanism *mechanism);

/* Solved number of a species by name, -1 when unknown or not solved. */
int mechanism_solved(const Mechanism *mechanism, const char *name);
/* Index into element[] or -1. */
int mechanism_element(const Mechanism *mechanism, const char *symbol);
/* Atoms of element in solved species s. */
int mechanism_atoms(const Mechanism *mechanism, int solved, int element);
const char *mechanism_name(const Mechanism *mechanism, int solved);

#endif
