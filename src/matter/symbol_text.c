/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What `explain` says of effective dynamics. Own derivations from the symbols of ebbturn/symbol.h: H = (dV/dt)/(3V) is
 * (df/db)/(2 gamma lambda), rho = rho_c f. */
#include "ebbturn/symbol.h"

#include <string.h>

#define EBB_FRIEDMANN "H^2 = (8 pi G/3) rho (1 - rho/rho_c),  rho = rho_c sin^2 b,  rho_c = 3/(8 pi G gamma^2 lambda^2)"

/* clang-format off */
static const struct { const char *name, *text; } table[] = {
    {"slqc", EBB_FRIEDMANN},
    {"aps", EBB_FRIEDMANN},
    {"mmo", EBB_FRIEDMANN},
    {"smmo", EBB_FRIEDMANN},
    {"wdw", "H^2 = (8 pi G/3) rho: Friedmann's own equation, no critical density, no bounce"},
    {"wdw_lattice", "H^2 = (8 pi G/3) rho: Friedmann's own equation, no critical density, no bounce"},
    {"mlqc1", "H^2 = (8 pi G rho_c/3) x (1 - x) (1 - rho/rho_I),  x = sin^2 b,  rho = rho_c x [1 - (1 + w) x],\n"
              "x = [1 -+ sqrt(1 - rho/rho_I)]/(2(1 + w)): - classical, + de Sitter branch;  w = omega gamma^2,\n"
              "critical density rho_I = rho_c/(4(1 + w)), Lambda_eff = 3 w/(gamma^2 lambda^2 (1 + w)^2) beyond it"},
    {"mlqc2", "H^2 = (32 pi G rho_c/3) q (1 - q) (1 + w rho/rho_c),  q = sin^2(b/2),  rho = 4 rho_c q (1 + w q),\n"
              "w = omega gamma^2,  critical density 4(1 + w) rho_c"},
    {"mu0", "H^2 = (8 pi G/3) rho (1 - rho/rho_c(V)),  rho_c(V) = 3/(8 pi G gamma^2 mu0^2 V^{2/3}): the critical density\n"
            "depends on the state, sqrt(2) [3/(8 pi G gamma^2 mu0^2)]^{3/2}/p_phi at the bounce"},
    {"refined", "H^2 = (8 pi G/3) rho (1 - rho/rho_c(V)),  rho_c(V) = 3/(8 pi G gamma^2 lambda(V)^2),  lambda(V) ~ V^{(1-2x)/3}:\n"
                "the critical density depends on the volume but at x = 1/2"},
    {"scalar", "rho = p_phi^2/(2 V^2); flat bounce at V = p_phi/sqrt(2 rho_c)"},
    {"dust_symmetric_sqrt", "rho = p_T/V; flat bounce at V = p_T/rho_c, V = V_b + 6 pi G p_T (T - T_b)^2"},
    {"dust_densitised", "rho = p_T/V; flat bounce at V = p_T/rho_c, V = V_b + 6 pi G p_T (T - T_b)^2"},
    {"unimodular", "rho = Lambda/(8 pi G) + p_phi^2/(2 V^2) <= rho_c; no bounce without the scalar"},
    {"radiation", "rho = p_A^2/(2 V^{4/3}); flat bounce at V = [p_A^2/(2 rho_c)]^{3/4}"},
    {"gravity.curvature",
     "with D = lambda/a:\n"
     "closed: H^2 = (8 pi G/3) (rho - rho_1) (1 - (rho - rho_1)/rho_c),  rho_1 = rho_c [(1 + gamma^2) D^2 - sin^2 D];\n"
     "bounce at rho = rho_c + rho_1, recollapse at rho = rho_1\n"
     "closed_connection: H = (sin b - D) cos b/(gamma lambda),  rho = rho_c [(sin b - D)^2 + gamma^2 D^2];\n"
     "two bounces in turn, at rho_c [(1 - D)^2 + gamma^2 D^2] and rho_c [(1 + D)^2 + gamma^2 D^2], recollapse at\n"
     "rho = rho_c gamma^2 D^2 = 3/(8 pi G a^2)\n"
     "open: H^2 = (8 pi G/3) (rho + rho_k) (1 - (rho + rho_k)/rho_c),  rho_k = 3/(8 pi G a^2);\n"
     "bounce also without matter, at a = gamma lambda"},
    {"gravity.cosmological_constant", "rho + Lambda/(8 pi G) in place of rho: bounce where matter has rho_c - Lambda/(8 pi G)"},
    {"gravity.lorentzian_weight", "omega: w = omega gamma^2 in the equations of mlqc1 and mlqc2"},
};
/* clang-format on */

const char *ebb_symbol_text(const char *name)
{
  for (size_t i = 0; i < sizeof table / sizeof table[0]; i++)
    if (!strcmp(table[i].name, name)) return table[i].text;
  return NULL;
}
