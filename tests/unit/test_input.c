/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Good models: defaults, every decision about scalars, overrides, profiles, JSON. Bad ones: tests/cli/bad_models.h. */
#include "ebbturn/constants.h"
#include "ebbturn/input.h"

#include "support/start.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define CLOCK  "clock: {from: -1, to: 1}\n"
#define PACKET "profile: gaussian_momentum, momentum: 500, relative_spread: 0.05"
#define STATE  "state: {" PACKET "}\n"

enum { NEED_ALL = EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, SETS_MAX = 4 };

/* Parses; true where good. message [256]: the first problem. */
static bool parse(const char *text, const char *const sets[], unsigned need, struct ebb_settings *settings,
                  char message[256])
{
  struct ebb_problems *problems = ebb_problems_create();
  size_t count = 0;
  bool good;

  cr_assert_not_null(problems);
  while (sets && sets[count]) count++;
  good = ebb_input_parse(text, strlen(text), sets, count, need, settings, problems);
  snprintf(message, 256, "%s", good ? "" : ebb_problems_text(problems, 0));
  ebb_problems_destroy(&problems);
  return good;
}

static struct ebb_settings parse_good(const char *text, const char *const sets[])
{
  struct ebb_settings settings;
  char message[256];

  cr_assert(parse(text, sets, NEED_ALL, &settings, message), "%s: %s", text, message);
  return settings;
}

Test(input, an_almost_empty_model_gets_every_default)
{
  struct ebb_settings s = parse_good(CLOCK STATE, NULL);

  cr_expect_str_eq(s.title, "");
  cr_expect_str_eq(s.gravity.prescription, "slqc");
  cr_expect_eq(s.gravity.immirzi, 0.2375);
  cr_expect_eq(s.gravity.newton, 1.0);
  cr_expect_eq(s.gravity.sector, 4.0);
  cr_expect_str_eq(s.gravity.curvature, "none");
  cr_expect_eq(s.gravity.cosmological_constant, 0.0);
  cr_expect(isnan(s.gravity.area_gap));
  /* rounding: square root and square, an epsilon each */
  ebb_test_close(s.gravity.polymer_scale * s.gravity.polymer_scale, ebb_default_area_gap(0.2375, 1.0),
                 ebb_test_rounding(2, 5.2));
  cr_expect_str_eq(s.clock.kind, "scalar");
  cr_expect_eq(s.clock.samples, 201);
  cr_expect_eq(s.state.bounce_at, 0.0);
  cr_expect_eq(s.state.squeeze, 0.0);
  cr_expect_str_eq(s.state.channel, "right");
  cr_expect_eq(s.lattice.volume_max, 0.0);
  cr_expect_eq(s.lattice.points, 0);
  cr_expect_str_eq(s.numerics.propagator, "auto");
  cr_expect_eq(s.numerics.tolerance, 1e-10);
  cr_expect_str_eq(s.output.file, "");
  cr_expect_eq(s.output.keep, EBB_KEEP_MOMENTS | EBB_KEEP_QUANTILES | EBB_KEEP_PROBABILITY | EBB_KEEP_STATE);
  cr_expect_eq(s.output.every, 1);
  cr_expect_eq(s.output.quantiles, 3);
  cr_expect_eq(s.output.quantile[2], 0.95);
  ebb_settings_clear(&s);
}

Test(input, keys_of_other_profiles_are_not_given)
{
  struct ebb_settings s = parse_good(CLOCK STATE, NULL);

  cr_expect(isnan(s.state.v0) && isnan(s.state.at) && isnan(s.state.b0) && isnan(s.state.chirp));
  cr_expect(isnan(s.state.lnv0) && isnan(s.state.density) && isnan(s.lattice.lnv_min));
  cr_expect_str_empty(s.state.branch);
  cr_expect_str_empty(s.state.file);
  cr_expect_null(s.state.component);
  ebb_settings_clear(&s);
}

/* What stands for state.bounce_at, and what it is: NAN where it is refused. */
Test(input, scalars_are_decided_once_real)
{
  static const struct {
    const char *text;
    double value;
  } rows[] = {{"0", 0},
              {"-1.5", -1.5},
              {"1e5", 1e5},
              {"1.0e-10", 1e-10},
              {"1E+5", 1e5},
              {"+1", 1},
              {"1.", 1},
              {".5", 0.5},
              {"-0", 0},
              {"1e05", 1e5},
              {"0.1234567890123456789", 0.1234567890123456789},
              {"no", NAN},
              {"yes", NAN},
              {"true", NAN},
              {"null", NAN},
              {"~", NAN},
              {".nan", NAN},
              {".inf", NAN},
              {"-.inf", NAN},
              {"nan", NAN},
              {"inf", NAN},
              {"infinity", NAN},
              {"0x10", NAN},
              {"0o10", NAN},
              {"010", NAN},
              {"00.5", NAN},
              {"1_000", NAN},
              {"1,5", NAN},
              {"'1'", NAN},
              {"\"1\"", NAN},
              {"''", NAN},
              {"", NAN},
              {".", NAN},
              {"e5", NAN},
              {"1e", NAN},
              {"1e+", NAN},
              {"--1", NAN},
              {"1 2", NAN},
              {"1:30", NAN},
              {"1e999", NAN},
              {"-1e999", NAN},
              {"1e-999", NAN},
              {"4e-320", NAN},
              {"1d5", NAN},
              {"1.5f", NAN},
              {"1\xc2\xa0", NAN},
              {"\xef\xbc\x91", NAN},
              {"|\n    1", NAN},
              {"[1]", NAN},
              {"{a: 1}", NAN}};

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char text[512], message[256];
    struct ebb_settings s;
    bool good;

    snprintf(text, sizeof text,
             CLOCK "state:\n  profile: gaussian_momentum\n  momentum: 5\n  relative_spread: 0.1\n  bounce_at: %s\n",
             rows[i].text);
    good = parse(text, NULL, NEED_ALL, &s, message);
    cr_expect_eq(good, !isnan(rows[i].value), "'%s': %s", rows[i].text, message);
    if (good)
      cr_expect_eq(s.state.bounce_at, rows[i].value, "'%s' is %.17g", rows[i].text, s.state.bounce_at);
    else
      cr_expect_not_null(strstr(message, "state.bounce_at"), "'%s': %s", rows[i].text, message);
    ebb_settings_clear(&s);
  }
}

/* The same for clock.samples; 0: refused. */
Test(input, scalars_are_decided_once_integer)
{
  static const struct {
    const char *text;
    int value;
  } rows[] = {{"2", 2},
              {"1000000", 1000000},
              {"1000001", 0},
              {"+3", 0},
              {"-3", 0},
              {"3.0", 0},
              {"3.", 0},
              {"1e3", 0},
              {"0x10", 0},
              {"010", 0},
              {"1_000", 0},
              {"'3'", 0},
              {"", 0},
              {"three", 0},
              {"4294967299", 0},
              {"18446744073709551619", 0},
              {"-9223372036854775809", 0}};

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char text[512], message[256];
    struct ebb_settings s;
    bool good;

    snprintf(text, sizeof text, "clock:\n  from: 0\n  to: 1\n  samples: %s\n" STATE, rows[i].text);
    good = parse(text, NULL, NEED_ALL, &s, message);
    cr_expect_eq(good, rows[i].value != 0, "'%s': %s", rows[i].text, message);
    if (good) cr_expect_eq(s.clock.samples, rows[i].value);
    ebb_settings_clear(&s);
  }
}

/* The same for title: any one-line text, quoted or not; NULL: refused. */
Test(input, scalars_are_decided_once_text)
{
  static const struct {
    const char *text, *value;
  } rows[] = {{"first bounce", "first bounce"},
              {"no", "no"},
              {"5", "5"},
              {"~", "~"},
              {"''", ""},
              {"'it''s'", "it's"},
              {"\"a \\u00e4\"", "a \xc3\xa4"},
              {"two\n  lines fold", "two lines fold"},
              {"", NULL},
              {"|\n  block", NULL},
              {"\"tab\\t\"", NULL},
              {"[a]", NULL}};

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char text[512], message[256];
    struct ebb_settings s;
    bool good;

    snprintf(text, sizeof text, "title: %s\n", rows[i].text);
    good = parse(text, NULL, EBB_NEED_MODEL, &s, message);
    cr_expect_eq(good, rows[i].value != NULL, "'%s': %s", rows[i].text, message);
    if (good) cr_expect_str_eq(s.title, rows[i].value);
    ebb_settings_clear(&s);
  }
}

Test(input, words_may_be_quoted_and_a_byte_order_mark_is_skipped)
{
  struct ebb_settings s = parse_good("\xef\xbb\xbf\"lattice\": {\"volume_max\": \"auto\"}\r\n"
                                     "gravity: {prescription: 'aps'}\r\n" CLOCK STATE,
                                     NULL);

  cr_expect_eq(s.lattice.volume_max, 0.0);
  cr_expect_str_eq(s.gravity.prescription, "aps");
  ebb_settings_clear(&s);
}

Test(input, a_command_says_what_it_needs)
{
  char message[256];
  struct ebb_settings s;

  cr_expect(parse("clock: {kind: scalar}\n", NULL, EBB_NEED_MODEL, &s, message), "%s", message);
  cr_expect_str_empty(s.state.profile);
  ebb_settings_clear(&s);
  cr_expect_not(parse("clock: {kind: scalar}\n", NULL, EBB_NEED_STATE, &s, message));
  cr_expect_not_null(strstr(message, "state.profile is missing"));
  ebb_settings_clear(&s);
  cr_expect_not(parse("clock: {kind: scalar}\n", NULL, EBB_NEED_CLOCK_RANGE, &s, message));
  cr_expect_not_null(strstr(message, "clock.from is missing"));
  ebb_settings_clear(&s);
  /* a state that nobody needs is checked all the same */
  cr_expect_not(parse("state: {profile: gaussian_momentum}\n", NULL, EBB_NEED_MODEL, &s, message));
  ebb_settings_clear(&s);
}

Test(input, profiles_take_their_keys)
{
  struct ebb_settings s = parse_good(
      CLOCK "state: {profile: gaussian_lnv, v0: infinity, momentum: 5, relative_spread: 0.1, branch: expanding}\n",
      NULL);

  cr_expect(isinf(s.state.v0));
  cr_expect_eq(s.state.at, 0.0);
  cr_expect_str_eq(s.state.branch, "expanding");
  cr_expect(isnan(s.state.bounce_at));
  ebb_settings_clear(&s);
  s = parse_good(CLOCK "state: {profile: gaussian_volume, v0: 1e4, spread: 100, b0: 0.1, at: -0.5}\n", NULL);
  cr_expect_eq(s.state.chirp, 0.0);
  cr_expect_eq(s.state.at, -0.5);
  ebb_settings_clear(&s);
  s = parse_good(CLOCK "state: {profile: from_effective, v: 1e4, density: 1e-3, relative_spread: 0.1}\n", NULL);
  cr_expect_str_eq(s.state.branch, "contracting");
  cr_expect(isnan(s.state.momentum));
  ebb_settings_clear(&s);
  s = parse_good(CLOCK "state: {profile: file, file: other.h5}\n", NULL);
  cr_expect_str_eq(s.state.file, "other.h5");
  ebb_settings_clear(&s);
}

Test(input, a_superposition_owns_its_components)
{
  struct ebb_settings s = parse_good(CLOCK "state:\n  profile: superposition\n  components:\n    - {" PACKET "}\n"
                                           "    - {weight: [0, -0.5], " PACKET ", squeeze: 2}\n"
                                           "    - weight: 3\n      profile: file\n      file: a.h5\n",
                                     NULL);

  cr_assert_eq(s.state.components, 3);
  cr_expect_eq(s.state.component[0].weight[0], 1.0);
  cr_expect_eq(s.state.component[0].weight[1], 0.0);
  cr_expect_eq(s.state.component[1].weight[1], -0.5);
  cr_expect_eq(s.state.component[1].squeeze, 2.0);
  cr_expect_eq(s.state.component[2].weight[0], 3.0);
  cr_expect_str_eq(s.state.component[2].profile, "file");
  cr_expect(isnan(s.state.momentum));
  ebb_settings_clear(&s);
  cr_expect_null(s.state.component);
}

Test(input, wdw_has_a_grid_and_its_own_packet)
{
  struct ebb_settings s =
      parse_good("gravity: {prescription: wdw}\nlattice: {lnv_min: -2, lnv_max: 12, points: 512}\n"
                 "numerics: {propagator: modes}\n" CLOCK "state: {" PACKET ", lnv0: 5, branch: both}\n",
                 NULL);

  cr_expect_eq(s.state.lnv0, 5.0);
  cr_expect_str_eq(s.state.branch, "both");
  cr_expect_eq(s.lattice.points, 512);
  cr_expect(isnan(s.lattice.volume_max));
  cr_expect(isnan(s.state.bounce_at));
  ebb_settings_clear(&s);
}

Test(input, full_lattices_have_channels)
{
  struct ebb_settings s = parse_good("gravity: {sector: 1}\n" CLOCK "state: {" PACKET ", channel: left}\n", NULL);

  cr_expect_str_eq(s.state.channel, "left");
  ebb_settings_clear(&s);
}

Test(input, overrides_follow_the_same_rules)
{
  static const struct {
    const char *set[SETS_MAX];
    const char *says; /* NULL: good */
  } rows[] = {
      {{"state.momentum=200"}, NULL},
      {{"output.keep=[moments]", "lattice.volume_max=auto", "title=a b"}, NULL},
      {{"matter=[]"}, NULL},
      {{"state.momentum=-1"}, "--set 'state.momentum=-1': state.momentum = -1 sqrt(G) must be above 0 sqrt(G)"},
      {{"state.momentun=1"}, "--set 'state.momentun=1': unknown setting 'state.momentun'; nearest is 'state.momentum'"},
      {{"state.momentum"}, "--set 'state.momentum': must have the form key.path=value"},
      {{"=1"}, "--set '=1': must have the form key.path=value"},
      {{"state.momentum="}, "--set 'state.momentum=': the text is empty"},
      {{"state.momentum='5'"},
       "--set 'state.momentum='5'': state.momentum = '5' is text; write the number without quotes"},
      {{"state.momentum=1", "state.momentum=2"}, "--set 'state.momentum=2': 'state.momentum' is set twice"},
      {{"state.v0=1"},
       "--set 'state.v0=1': state.v0 does not belong to profile 'gaussian_momentum', which takes "
       "momentum, relative_spread, bounce_at, squeeze, channel"},
      {{"gravity.area_gap=4", "gravity.polymer_scale=2"},
       "--set 'gravity.area_gap=4': gravity.area_gap is the square of gravity.polymer_scale; give at most one of them"},
      {{"clock.to=-2"}, "--set 'clock.to=-2': clock.to = -2 1/sqrt(G) must be above clock.from = -1 1/sqrt(G)"},
      {{"clock.to=[1"},
       "--set 'clock.to=[1': not valid YAML: did not find expected ',' or ']' while parsing a flow sequence"},
      {{"state.components.weight=2"}, "--set 'state.components.weight=2': unknown setting 'state.components.weight'"},
  };

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    struct ebb_settings s;
    char message[256];
    const bool good = parse(CLOCK STATE, rows[i].set, NEED_ALL, &s, message);

    cr_expect_eq(good, rows[i].says == NULL, "%s: %s", rows[i].set[0], message);
    if (rows[i].says) cr_expect_eq(strncmp(message, rows[i].says, strlen(rows[i].says)), 0, "%s", message);
    ebb_settings_clear(&s);
  }
}

Test(input, an_override_wins_over_the_file_and_may_add_what_it_lacks)
{
  struct ebb_settings s = parse_good(
      CLOCK STATE, (const char *const[]){"state.momentum=200", "gravity.area_gap=4", "output.quantiles=[0.5]", NULL});

  cr_expect_eq(s.state.momentum, 200.0);
  cr_expect_eq(s.gravity.polymer_scale, 2.0);
  cr_expect_eq(s.output.quantiles, 1);
  ebb_settings_clear(&s);
  s = parse_good(CLOCK, (const char *const[]){"state.profile=superposition", "state.components=[{" PACKET "}]", NULL});
  cr_expect_eq(s.state.components, 1);
  cr_expect_eq(s.state.component[0].momentum, 500.0);
  ebb_settings_clear(&s);
}

/* As YAML holds JSON, the JSON of a model is a model; its own JSON must be the same text. */
Test(input, json_is_a_model_with_the_same_settings)
{
  static const char *const models[] = {
      CLOCK STATE,
      "title: \"q \\\"uoted\\\" \\\\ \xc3\xa4\"\ngravity: {prescription: aps, immirzi: 0.1, area_gap: 5.1, sector: "
      "1.3}\n" CLOCK "state: {" PACKET
      ", channel: left, squeeze: -1}\nlattice: {points: 100}\noutput: {keep: [], file: a/b.h5}\n",
      CLOCK "state: {profile: gaussian_lnv, v0: infinity, momentum: 5, relative_spread: 0.1}\n",
      CLOCK "state: {profile: superposition, components: [{" PACKET "}, {weight: [0.1, 2], " PACKET "}]}\n",
      "gravity: {prescription: wdw}\nlattice: {lnv_min: -2, lnv_max: 12, points: 512}\n" CLOCK "state: {" PACKET
      ", lnv0: 5, branch: both}\n",
      /* keys of a section after one that stands inside it, and a further field */
      "gravity: {prescription: mlqc1, lorentzian_weight: 2, extension: {delta: 0.4}}\n" CLOCK STATE,
      "gravity: {curvature: open, extension: {tau: 0.4}}\n" CLOCK STATE,
      CLOCK STATE "matter: [{name: chi, kind: scalar, grid: {length: 1, points: 8}, momentum: 3, spread: 2}]\n",
  };

  for (size_t i = 0; i < sizeof models / sizeof *models; i++) {
    struct ebb_settings s = parse_good(models[i], NULL), again;
    char *json = ebb_settings_json(&s), *json_again;

    cr_assert_not_null(json);
    again = parse_good(json, NULL);
    json_again = ebb_settings_json(&again);
    cr_expect_str_eq(json, json_again);
    cr_expect_eq(s.gravity.polymer_scale, again.gravity.polymer_scale);
    free(json);
    free(json_again);
    ebb_settings_clear(&s);
    ebb_settings_clear(&again);
  }
}

Test(input, json_text_is_what_scripts_rely_on)
{
  struct ebb_settings s = parse_good("gravity: {polymer_scale: 2}\n" CLOCK STATE, NULL);
  char *json = ebb_settings_json(&s);

  cr_expect_str_eq(
      json,
      "{\"title\": \"\", \"gravity\": {\"prescription\": \"slqc\", \"immirzi\": 0.23749999999999999, "
      "\"polymer_scale\": 2, \"newton\": 1, \"sector\": 4, \"curvature\": \"none\", \"cosmological_constant\": 0}, "
      "\"clock\": {\"kind\": \"scalar\", \"from\": -1, \"to\": 1, \"samples\": 201}, \"matter\": [], "
      "\"state\": {\"profile\": \"gaussian_momentum\", \"momentum\": 500, \"relative_spread\": "
      "0.050000000000000003, \"bounce_at\": 0, \"squeeze\": 0, \"channel\": \"right\"}, "
      "\"lattice\": {\"volume_max\": \"auto\", \"layout\": \"auto\"}, \"numerics\": {\"propagator\": \"auto\", \"tolerance\": 1e-10, "
      "\"eigensolver\": \"auto\"}, "
      "\"output\": {\"keep\": [\"moments\", \"quantiles\", \"probability\", \"state\"], \"every\": 1, "
      "\"quantiles\": [0.050000000000000003, 0.5, 0.94999999999999996]}}");
  free(json);
  ebb_settings_clear(&s);
}

Test(input, the_print_names_every_setting_with_its_unit)
{
  struct ebb_settings s = parse_good(CLOCK "state: {profile: superposition, components: [{" PACKET "}]}\n", NULL);
  char *text = NULL;
  size_t size;
  FILE *out = open_memstream(&text, &size);

  cr_assert_not_null(out);
  ebb_settings_print(&s, out);
  fclose(out);
  cr_expect_not_null(strstr(text, "state.components[0].momentum"));
  cr_expect_not_null(strstr(text, "500 sqrt(G)"));
  cr_expect_not_null(strstr(text, " length "));
  cr_expect_not_null(strstr(text, "lambda"));
  free(text);
  ebb_settings_clear(&s);
}

/* Sections nest: the JSON of an extension opens its section inside gravity's and is a model again. */
Test(input, nested_sections_come_back_from_json)
{
  static const char model[] = "gravity: {extension: {delta: 0.5}, cosmological_constant_over_critical: 0.25}\n"
                              "spectrum: {interval: [-1, 2]}\n";
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_settings s, again;
  char *json, *json_again;

  cr_assert(ebb_input_parse(model, strlen(model), NULL, 0, EBB_NEED_SPECTRUM, &s, problems), "%s",
            ebb_problems_text(problems, 0));
  cr_expect_eq(s.gravity.extension_delta, 0.5);
  cr_expect(isnan(s.gravity.extension_tau));
  json = ebb_settings_json(&s);
  cr_expect_not_null(strstr(json, "\"extension\": {\"delta\": 0.5}}, \"clock\""), "%s", json);
  cr_assert(ebb_input_parse(json, strlen(json), NULL, 0, EBB_NEED_SPECTRUM, &again, problems), "%s",
            ebb_problems_text(problems, 0));
  json_again = ebb_settings_json(&again);
  cr_expect_str_eq(json, json_again);
  cr_expect_eq(again.gravity.cosmological_constant, s.gravity.cosmological_constant);
  free(json);
  free(json_again);
  ebb_settings_clear(&again);
  cr_assert(ebb_input_parse(model, strlen(model), (const char *const[]){"gravity.extension.delta=0.75"}, 1,
                            EBB_NEED_SPECTRUM, &again, problems));
  cr_expect_eq(again.gravity.extension_delta, 0.75);
  ebb_settings_clear(&again);
  ebb_settings_clear(&s);
  ebb_problems_destroy(&problems);
}
