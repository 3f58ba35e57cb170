/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The command line as users meet it: help, mistakes, exit codes, the catalogues. */
#include "ebbturn/command.h"
#include "ebbturn/input.h"
#include "ebbturn/matter.h"
#include "ebbturn/operators.h"
#include "ebbturn/propagator.h"
#include "ebbturn/state.h"
#include "support/start.h"

#include <stdio.h>
#include <string.h>

/* ebbturn WORDS...: exit code, and a part of what it says on stdout and stderr (NULL: nothing there). */
static void expect(int status, const char *out, const char *err, const char *const words[])
{
  struct ebb_test_run run = ebb_test_ebbturn(NULL, 0, words);
  const char *first = words[0] ? words[0] : "(nothing)";

  cr_expect_eq(run.status, status, "%s: exit %d, %s", first, run.status, run.err);
  if (out)
    cr_expect_not_null(strstr(run.out, out), "%s: %s", first, run.out);
  else
    cr_expect_str_empty(run.out, "%s: %s", first, run.out);
  if (err)
    cr_expect_not_null(strstr(run.err, err), "%s: %s", first, run.err);
  else
    cr_expect_str_empty(run.err, "%s: %s", first, run.err);
  ebb_test_run_clear(&run);
}
#define EXPECT(status, out, err, ...) expect((status), (out), (err), (const char *const[]){__VA_ARGS__})

Test(command_line, help_asked_for_goes_to_stdout)
{
  EXPECT(0, "usage: ebbturn COMMAND", NULL, "--help", NULL);
  EXPECT(0, "usage: ebbturn COMMAND", NULL, "-h", NULL);
  EXPECT(0, "libyaml", NULL, "--version", NULL);
  for (size_t i = 0; i < ebb_commands(); i++) {
    char usage[128];

    snprintf(usage, sizeof usage, "usage: ebbturn %s %s", ebb_command_at(i)->name, ebb_command_at(i)->synopsis);
    EXPECT(0, usage, NULL, ebb_command_at(i)->name, "--help", NULL);
  }
}

Test(command_line, mistakes_go_to_stderr_with_exit_2)
{
  EXPECT(2, NULL, "usage: ebbturn COMMAND", NULL);
  EXPECT(2, NULL, "ebbturn: error: unknown command 'evolv'; nearest is 'evolve'", "evolv", NULL);
  EXPECT(2, NULL, "ebbturn: error: unknown command 'xyzzy'\n", "xyzzy", NULL);
  EXPECT(2, NULL, "ebbturn: error: unknown option '--hepl'\n", "--hepl", NULL);
  EXPECT(2, NULL, "unknown option '--ste'; nearest is '--set'", "check", "--ste", "a=b", "x.yaml", NULL);
  EXPECT(2, NULL, "unknown option '-z'", "check", "-z", NULL);
  EXPECT(2, NULL, "option '--set' needs a value", "check", "x.yaml", "--set", NULL);
  EXPECT(2, NULL, "'check' needs MODEL", "check", NULL);
  EXPECT(2, NULL, "there is no place for 'y.yaml'", "check", "x.yaml", "y.yaml", NULL);
  EXPECT(2, NULL, "takes no options for PETSc", "list", "--", "-info", NULL);
  EXPECT(2, NULL, "must be options for PETSc, not 'info'", "check", "x.yaml", "--", "info", NULL);
  EXPECT(2, NULL, "'--output' is given twice", "evolve", "x.yaml", "-o", "a", "-o", "b", NULL);
  EXPECT(2, NULL, "'--progress' takes auto, always or never", "evolve", "x.yaml", "--progress=often", NULL);
}

Test(command_line, catalogues_can_be_listed)
{
  static const char *const kinds[] = {"prescriptions", "profiles", "clocks", "propagators", "commands", "settings"};
  static const char *const holds[] = {"slqc", "from_effective", "scalar", "chebyshev", "explain", "output.quantiles"};

  for (size_t i = 0; i < sizeof kinds / sizeof *kinds; i++) EXPECT(0, holds[i], NULL, "list", kinds[i], NULL);
  EXPECT(0, kinds[5], NULL, "list", NULL);
  EXPECT(2, NULL, "unknown kind 'profile'; nearest is 'profiles'", "list", "profile", NULL);
}

/* Exit code of `explain NAME`, called here: a start of the program for every entry would take a minute. */
static int explain(const char *name, bool bibtex)
{
  const struct ebb_invocation invocation = {.operand = {name}, .operands = 1, .bibtex = bibtex};

  return ebb_command_find("explain")->run(&invocation);
}

Test(command_line, every_entry_can_be_explained)
{
  cr_assert_not_null(freopen("/dev/null", "w", stdout));
  for (size_t i = 0; i < ebb_prescriptions(); i++) {
    cr_expect_eq(explain(ebb_prescription_at(i)->name, false), 0, "%s", ebb_prescription_at(i)->name);
    cr_expect_eq(explain(ebb_prescription_at(i)->name, true), 0, "%s", ebb_prescription_at(i)->name);
  }
  for (size_t i = 0; i < ebb_profiles(); i++)
    cr_expect_eq(explain(ebb_profile_at(i)->name, false), 0, "%s", ebb_profile_at(i)->name);
  for (size_t i = 0; i < ebb_propagators(); i++)
    cr_expect_eq(explain(ebb_propagator_at(i)->name, false), 0, "%s", ebb_propagator_at(i)->name);
  for (size_t i = 0; i < ebb_clocks(); i++)
    cr_expect_eq(explain(ebb_clock_at(i)->name, false), 0, "%s", ebb_clock_at(i)->name);
  for (size_t i = 0; i < ebb_setting_count(); i++)
    cr_expect_eq(explain(ebb_setting_at(i)->key, false), 0, "%s", ebb_setting_at(i)->key);
}

Test(command_line, an_explanation_says_what_the_row_says)
{
  struct ebb_test_run run = ebb_test_ebbturn(NULL, 0, (const char *const[]){"explain", "gravity.immirzi", NULL});

  cr_expect_not_null(strstr(run.out, "gamma"));
  cr_expect_not_null(strstr(run.out, "in (0, 10]"));
  cr_expect_not_null(strstr(run.out, "0.2375"));
  ebb_test_run_clear(&run);
  EXPECT(0, ebb_prescription_find("aps")->source, NULL, "explain", "aps", NULL);
  EXPECT(0, ebb_prescription_find("aps")->bibtex, NULL, "explain", "aps", "--bibtex", NULL);
  EXPECT(0, "state.v0", NULL, "explain", "gaussian_lnv", NULL);
  EXPECT(0, ebb_propagator_find("chebyshev")->title, NULL, "explain", "chebyshev", NULL);
  EXPECT(0, ebb_clock_find("unimodular")->source, NULL, "explain", "unimodular", NULL);
  EXPECT(0, "clock.ordering", NULL, "explain", "dust", NULL);
  EXPECT(2, NULL, "unknown name 'slqq'; nearest is 'slqc'", "explain", "slqq", NULL);
  EXPECT(2, NULL, "unknown name 'immirzi'; nearest is 'gravity.immirzi'", "explain", "immirzi", NULL);
  EXPECT(2, NULL, "'gravity.immirzi' has no BibTeX entry", "explain", "gravity.immirzi", "--bibtex", NULL);
}

Test(command_line, on_several_ranks_one_speaks)
{
  struct ebb_test_run one = ebb_test_ebbturn(NULL, 0, (const char *const[]){"list", "clocks", NULL});
  struct ebb_test_run two = ebb_test_ebbturn(NULL, 2, (const char *const[]){"list", "clocks", NULL});

  cr_expect_eq(two.status, 0);
  cr_expect_not_null(strstr(one.out, ebb_clock_at(0)->name));
  cr_expect_str_eq(two.out, one.out);
  ebb_test_run_clear(&one);
  ebb_test_run_clear(&two);
}
