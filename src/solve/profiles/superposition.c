/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"

/* Resolved component by component where packets are made; the entry exists so that lists and explanations show it. */
const struct ebb_profile ebb_profile_superposition = {
    .name = "superposition",
    .title = "complex combination of other profiles",
    .formula = "sum_i weight_i state_i, each state_i normalised, the sum normalised again",
    .source = "linearity",
};
