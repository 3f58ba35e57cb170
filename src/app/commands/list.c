/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/command.h"
#include "ebbturn/input.h"
#include "ebbturn/matter.h"
#include "ebbturn/operators.h"
#include "ebbturn/propagator.h"
#include "ebbturn/relational.h"
#include "ebbturn/state.h"

#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_list = {
    .name = "list",
    .synopsis = "[KIND]",
    .summary = "list the catalogues: prescriptions, settings and the rest",
    .help = "Without KIND, the kinds there are. 'ebbturn explain NAME' says everything about one entry.",
    .operands_min = 0,
    .operands_max = 1,
    .run = run,
};

static void list_prescriptions(void)
{
  for (size_t i = 0; i < ebb_prescriptions(); i++)
    printf("  %-20s %s\n", ebb_prescription_at(i)->name, ebb_prescription_at(i)->title);
}

static void list_profiles(void)
{
  for (size_t i = 0; i < ebb_profiles(); i++) printf("  %-20s %s\n", ebb_profile_at(i)->name, ebb_profile_at(i)->title);
}

static void list_propagators(void)
{
  const struct ebb_setting *setting = ebb_setting_find("numerics.propagator");

  for (size_t i = 0; ebb_setting_choice(setting, i); i++) {
    const struct ebb_propagator *one = ebb_propagator_find(ebb_setting_choice(setting, i));

    printf("  %-20s %s\n", ebb_setting_choice(setting, i), one ? one->title : "the program chooses and says why");
  }
}

static void list_clocks(void)
{
  for (size_t i = 0; i < ebb_clocks(); i++) printf("  %-20s %s\n", ebb_clock_at(i)->name, ebb_clock_at(i)->title);
}

static void list_readings(void)
{
  for (size_t i = 0; i < ebb_reading_kinds(); i++) {
    const struct ebb_reading_word *word = ebb_reading_word_of(ebb_reading_kind_at(i));

    printf("  %-20s %s\n", word->name, word->title);
  }
}

static void list_commands(void)
{
  for (size_t i = 0; i < ebb_commands(); i++)
    printf("  %-20s %s\n", ebb_command_at(i)->name, ebb_command_at(i)->summary);
}

static void list_settings(void)
{
  for (size_t i = 0; i < ebb_setting_count(); i++)
    printf("  %-32s %s\n", ebb_setting_at(i)->key, ebb_setting_at(i)->sentence);
}

static const struct {
  const char *name, *sentence;
  void (*list)(void);
} kinds[] = {
    {"prescriptions", "orderings of the Hamiltonian constraint", list_prescriptions},
    {"profiles", "shapes of the physical state", list_profiles},
    {"clocks", "fields whose value serves as clock", list_clocks},
    {"propagators", "ways to evolve a state", list_propagators},
    {"readings", "what clocks inside the universe read", list_readings},
    {"commands", "what ebbturn does", list_commands},
    {"settings", "keys of a model file", list_settings},
};
enum { KINDS = sizeof kinds / sizeof kinds[0] };

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_nearest nearest;
  struct ebb_text quoted = {0};

  if (invocation->operands == 0) {
    for (size_t i = 0; i < KINDS; i++) printf("  %-20s %s\n", kinds[i].name, kinds[i].sentence);
    return EBB_EXIT_OK;
  }
  ebb_nearest_start(&nearest, invocation->operand[0]);
  for (size_t i = 0; i < KINDS; i++) {
    if (!strcmp(kinds[i].name, invocation->operand[0])) {
      kinds[i].list();
      return EBB_EXIT_OK;
    }
    ebb_nearest_try(&nearest, kinds[i].name);
  }
  ebb_text_append_quoted(&quoted, invocation->operand[0], strlen(invocation->operand[0]));
  fprintf(stderr, "ebbturn: error: unknown kind %s", ebb_text_get(&quoted));
  if (ebb_nearest_word(&nearest)) fprintf(stderr, "; nearest is '%s'", ebb_nearest_word(&nearest));
  fprintf(stderr, "\n  try       'ebbturn list'\n");
  ebb_text_clear(&quoted);
  return EBB_EXIT_USAGE;
}
