/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What an instrument makes of a spectrum: amplitude windows of the clock, bins of the system. */
#include "readings/reading.h"

#include <math.h>
#include <string.h>

static const double SMALLEST = 1e-20; /* amplitude below which a coefficient is left out of an outcome */
static const double SAME = 1e-9;      /* relative distance of two values that count as one */

double ebb_central_binomial(int n)
{
  double c = 1.0;

  for (int k = 1; k <= n; k++) c *= (2.0 * k - 1.0) / (2.0 * k);
  return c;
}

double ebb_cosine_power_norm(int power, int centres)
{
  /* sum_i cos^{2p}(b - b_i) = m C(2p, p)/4^p for m > p equally spaced centres */
  return 1.0 / sqrt((double)centres * ebb_central_binomial(power));
}

/* Outer edges of the bins; false where nothing says them. */
static bool edges(const struct ebb_representation *rep, const struct ebb_reading_settings *s, double *from, double *to)
{
  const struct ebb_reading_word *w = &rep->kind->word;
  const bool plain = rep->function == EBB_FUNCTION_NONE;

  *from = !isnan(s->from) ? s->from : w->bounded && plain ? w->from : NAN;
  *to = !isnan(s->to) ? s->to : w->bounded && plain ? w->to : NAN;
  if (plain && !strcmp(w->name, "hubble")) { /* its edge depends on gamma lambda */
    const double most = rep->space->model->constants->hubble_max;

    if (isnan(*from)) *from = -most;
    if (isnan(*to)) *to = most;
  }
  return !isnan(*from) && !isnan(*to);
}

/* W_i at a value. */
struct shape {
  enum ebb_instrument instrument;
  double from, width, norm; /* centres from + (i + 1/2) width */
  int power;
  bool periodic; /* b: modulo pi */
};

static double amplitude(const struct shape *f, PetscInt n, PetscInt i, double value)
{
  const double centre = f->from + ((double)i + 0.5) * f->width;
  double x = value - centre;

  if (f->instrument == EBB_INSTRUMENT_SHARP) {
    const double place = floor((value - f->from) / f->width);
    return place == (double)i || (f->periodic && i == n - 1 && place == (double)n) ? 1.0 : 0.0;
  }
  if (f->periodic) x -= EBB_PI * floor(x / EBB_PI + 0.5);
  if (f->instrument == EBB_INSTRUMENT_COSINE_POWER) return f->norm * pow(cos(x), f->power);
  return fabs(x) < f->width ? cos(EBB_PI * x / (2.0 * f->width)) : 0.0;
}

/* Outcomes whose window may reach a value: all of them for cosine_power, else the nearest ones. */
static void candidates(const struct shape *f, PetscInt n, double value, PetscInt *first, PetscInt *last)
{
  const PetscInt near = (PetscInt)floor(fmin(fmax((value - f->from) / f->width, -2.0), (double)n + 2.0));

  *first = f->instrument == EBB_INSTRUMENT_COSINE_POWER ? 0 : near - 1;
  *last = f->instrument == EBB_INSTRUMENT_COSINE_POWER ? n - 1 : near + 1;
  if (f->periodic) return; /* taken modulo n */
  *first = PetscMax(*first, 0);
  *last = PetscMin(*last, n - 1);
}

/* Calls for every coefficient and outcome; counts or fills. */
static void visit(const struct ebb_representation *rep, const struct shape *f, struct ebb_windows *w, size_t *fill)
{
  for (size_t c = 0; c < rep->size; c++) {
    PetscInt first, last;
    double sum = 0.0;

    candidates(f, w->n, rep->value[c], &first, &last);
    for (PetscInt j = first; j <= last && j < first + w->n; j++) {
      const PetscInt i = (j % w->n + w->n) % w->n;
      const double a = amplitude(f, w->n, i, rep->value[c]);

      sum += a * a;
      if (fabs(a) < SMALLEST) continue;
      if (w->index) {
        w->index[fill[i]] = c;
        w->amplitude[fill[i]] = a;
      }
      fill[i]++;
    }
    if (w->index) w->rest[c] = 1.0 - sum;
  }
}

/* Every distinct value an outcome of its own. */
static PetscErrorCode points(const struct ebb_representation *rep, struct ebb_windows *w)
{
  PetscInt n = 0;
  double *value;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(rep->size, &value));
  memcpy(value, rep->value, rep->size * sizeof *value);
  PetscCall(PetscSortReal((PetscInt)rep->size, value));
  for (size_t c = 0; c < rep->size; c++)
    if (n == 0 || value[c] - value[n - 1] > SAME * fmax(fabs(value[c]), SAME)) value[n++] = value[c];
  w->n = n;
  PetscCall(PetscMalloc1(n, &w->centre));
  memcpy(w->centre, value, (size_t)n * sizeof *value);
  PetscCall(PetscFree(value));
  PetscCall(PetscCalloc1(n + 1, &w->start));
  PetscCall(PetscMalloc3(rep->size, &w->index, rep->size, &w->amplitude, rep->size, &w->rest));
  for (int pass = 0; pass < 2; pass++) {
    size_t *fill;

    PetscCall(PetscCalloc1(n, &fill));
    for (PetscInt i = 0; i < n && pass; i++) fill[i] = w->start[i];
    for (size_t c = 0; c < rep->size; c++) {
      PetscInt low = 0, high = n - 1;

      while (low < high) { /* the last centre not above the value, with room for rounding */
        const PetscInt middle = (low + high + 1) / 2;
        if (w->centre[middle] <= rep->value[c] + SAME * fmax(fabs(rep->value[c]), SAME))
          low = middle;
        else
          high = middle - 1;
      }
      if (pass) {
        w->index[fill[low]] = c;
        w->amplitude[fill[low]] = 1.0;
        w->rest[c] = 0.0;
      }
      fill[low]++;
    }
    for (PetscInt i = 0; i < n && !pass; i++) w->start[i + 1] = w->start[i] + fill[i];
    PetscCall(PetscFree(fill));
  }
  PetscCall(PetscCalloc1(n, &w->no_limit));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_windows_create(const struct ebb_representation *rep, const struct ebb_reading_settings *settings,
                                  struct ebb_windows **windows, char problem[], size_t size)
{
  struct ebb_windows *w;
  struct shape f = {.instrument = settings->instrument, .power = settings->power};
  double from = 0.0, to = 0.0;
  size_t *fill;

  PetscFunctionBegin;
  PetscCall(PetscNew(&w));
  *windows = w;
  if (settings->instrument == EBB_INSTRUMENT_SITES) {
    PetscCall(points(rep, w));
    PetscFunctionReturn(0);
  }
  if (!edges(rep, settings, &from, &to) || !(from < to)) {
    PetscCall(PetscSNPrintf(problem, size, "clock.from and clock.to must say where the bins of '%s' lie",
                            rep->kind->word.name));
    PetscFunctionReturn(0);
  }
  w->n = settings->instrument == EBB_INSTRUMENT_COSINE_POWER ? settings->centres : settings->bins;
  w->touches = settings->instrument != EBB_INSTRUMENT_SHARP;
  f.from = from;
  f.width = (to - from) / (double)w->n;
  f.periodic = rep->kind->word.fixed && rep->function == EBB_FUNCTION_NONE;
  f.norm =
      settings->instrument == EBB_INSTRUMENT_COSINE_POWER ? ebb_cosine_power_norm(f.power, settings->centres) : 1.0;
  PetscCall(PetscMalloc1(w->n, &w->centre));
  PetscCall(PetscCalloc1(w->n + 1, &w->start));
  PetscCall(PetscCalloc1(w->n, &w->no_limit));
  PetscCall(PetscCalloc1(w->n, &fill));
  visit(rep, &f, w, fill);
  for (PetscInt i = 0; i < w->n; i++) {
    w->centre[i] = from + ((double)i + 0.5) * f.width;
    w->start[i + 1] = w->start[i] + fill[i];
    fill[i] = w->start[i];
    for (int l = 0; l < rep->kind->limits; l++) {
      const double a = amplitude(&f, w->n, i, ebb_function_value(rep->function, rep->kind->limit[l]));
      w->no_limit[i] = w->no_limit[i] || (settings->instrument != EBB_INSTRUMENT_COSINE_POWER && fabs(a) > SMALLEST);
    }
  }
  PetscCall(PetscMalloc3(w->start[w->n], &w->index, w->start[w->n], &w->amplitude, rep->size, &w->rest));
  visit(rep, &f, w, fill);
  PetscCall(PetscFree(fill));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_windows_destroy(struct ebb_windows **windows)
{
  PetscFunctionBegin;
  if (!*windows) PetscFunctionReturn(0);
  PetscCall(PetscFree3((*windows)->index, (*windows)->amplitude, (*windows)->rest));
  PetscCall(PetscFree((*windows)->start));
  PetscCall(PetscFree((*windows)->no_limit));
  PetscCall(PetscFree((*windows)->centre));
  PetscCall(PetscFree(*windows));
  PetscFunctionReturn(0);
}

/* Sites: every distinct value a bin. */
static PetscErrorCode bins_of_sites(size_t size, const double value[], double half_cell, struct ebb_bins *b)
{
  double *sorted;
  PetscInt n = 0;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(size, &sorted));
  for (size_t c = 0; c < size; c++)
    if (isfinite(value[c])) sorted[n++] = value[c];
  PetscCall(PetscSortReal(n, sorted));
  b->n = 0;
  for (PetscInt c = 0; c < n; c++)
    if (b->n == 0 || sorted[c] - sorted[b->n - 1] > SAME * fmax(fabs(sorted[c]), 1.0)) sorted[b->n++] = sorted[c];
  PetscCall(PetscMalloc3(b->n, &b->centre, b->n, &b->low, b->n, &b->high));
  for (PetscInt q = 0; q < b->n; q++) {
    const double below = q > 0 ? sorted[q] - sorted[q - 1] : b->n > 1 ? sorted[1] - sorted[0] : 1.0;
    const double above = q + 1 < b->n ? sorted[q + 1] - sorted[q] : below;

    b->centre[q] = sorted[q];
    b->low[q] = sorted[q] - (half_cell > 0.0 ? half_cell : 0.5 * below);
    b->high[q] = sorted[q] + (half_cell > 0.0 ? half_cell : 0.5 * above);
  }
  for (size_t c = 0; c < size; c++) {
    PetscInt low = 0, high = b->n - 1;

    while (low < high) {
      const PetscInt middle = (low + high + 1) / 2;
      if (b->centre[middle] <= value[c] + SAME * fmax(fabs(value[c]), 1.0))
        low = middle;
      else
        high = middle - 1;
    }
    b->map[c] = isfinite(value[c]) ? low : -1; /* -inf and nan are outside every bin */
  }
  PetscCall(PetscFree(sorted));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_bins_create(const struct ebb_reading_settings *settings, size_t size, const double value[],
                               double half_cell, double low_most, double high_most, struct ebb_bins **bins)
{
  const bool logarithmic = settings->binning == EBB_BINNING_LOG;
  const double from = isnan(settings->system_from) ? low_most : settings->system_from;
  const double to = isnan(settings->system_to) ? high_most : settings->system_to;
  struct ebb_bins *b;

  PetscFunctionBegin;
  PetscCall(PetscNew(&b));
  *bins = b;
  PetscCall(PetscMalloc1(size, &b->map));
  if (settings->binning == EBB_BINNING_SITES) {
    PetscCall(bins_of_sites(size, value, half_cell, b));
  } else {
    const double a = logarithmic ? log(from) : from, z = logarithmic ? log(to) : to;
    const double width = (z - a) / (double)settings->system_bins;

    b->n = settings->system_bins;
    PetscCall(PetscMalloc3(b->n, &b->centre, b->n, &b->low, b->n, &b->high));
    for (PetscInt q = 0; q < b->n; q++) {
      const double low = a + (double)q * width, high = a + (double)(q + 1) * width;

      b->low[q] = logarithmic ? exp(low) : low;
      b->high[q] = logarithmic ? exp(high) : high;
      b->centre[q] = logarithmic ? exp(0.5 * (low + high)) : 0.5 * (low + high);
    }
    for (size_t c = 0; c < size; c++) {
      const double place = floor(((logarithmic ? log(value[c]) : value[c]) - a) / width);
      b->map[c] = place >= 0.0 && place < (double)b->n ? (PetscInt)place : -1;
    }
  }
  b->contiguous = true;
  for (PetscInt q = 1; q < b->n; q++)
    if (fabs(b->low[q] - b->high[q - 1]) > SAME * fmax(fabs(b->low[q]), 1.0)) b->contiguous = false;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_bins_destroy(struct ebb_bins **bins)
{
  PetscFunctionBegin;
  if (!*bins) PetscFunctionReturn(0);
  PetscCall(PetscFree3((*bins)->centre, (*bins)->low, (*bins)->high));
  PetscCall(PetscFree((*bins)->map));
  PetscCall(ebb_row_bins_destroy(&(*bins)->rows));
  PetscCall(PetscFree(*bins));
  PetscFunctionReturn(0);
}

void ebb_bins_range(const struct ebb_reading_settings *settings, bool volume, double half_cell, double *low,
                    double *high)
{
  if (settings->binning == EBB_BINNING_LOG && volume) { /* the cells of the first and the last site */
    *low = fmax(*low - half_cell, 0.5 * *low);
    *high += half_cell;
  } else {
    *high += half_cell > 0.0 ? half_cell : 1e-9 * fmax(fabs(*high), 1.0);
    if (half_cell > 0.0) *low = fmax(*low - half_cell, 0.0);
  }
}

/* Share of the bins' mass below x, the mass of a bin spread uniformly over its cell. */
static double mass_below(const struct ebb_bins *b, const double mass[], double x)
{
  double sum = 0.0;

  for (PetscInt q = 0; q < b->n; q++)
    if (x > b->low[q]) sum += mass[q] * fmin((x - b->low[q]) / (b->high[q] - b->low[q]), 1.0);
  return sum;
}

static double quantile(const struct ebb_bins *b, const double mass[], double level)
{
  enum { BISECTIONS = 100 };
  double total = 0.0, sum = 0.0, low = b->low[0], high = b->high[b->n - 1];

  for (PetscInt q = 0; q < b->n; q++) total += mass[q];
  if (!(total > 0.0)) return NAN;
  if (b->contiguous) {
    for (PetscInt q = 0; q < b->n; q++) {
      if (sum + mass[q] >= level * total && mass[q] > 0.0)
        return b->low[q] + (b->high[q] - b->low[q]) * (level * total - sum) / mass[q];
      sum += mass[q];
    }
    return high;
  }
  for (PetscInt q = 0; q < b->n; q++) {
    low = fmin(low, b->low[q]);
    high = fmax(high, b->high[q]);
  }
  for (int step = 0; step < BISECTIONS; step++) {
    const double middle = 0.5 * (low + high);

    if (mass_below(b, mass, middle) < level * total)
      low = middle;
    else
      high = middle;
  }
  return 0.5 * (low + high);
}

PetscErrorCode ebb_bins_quantiles(const struct ebb_bins *b, const double mass[], PetscInt n, const double level[],
                                  double value[])
{
  PetscFunctionBegin;
  if (b->rows)
    PetscCall(ebb_row_bins_quantiles(b, mass, n, level, value));
  else
    for (PetscInt i = 0; i < n; i++) value[i] = quantile(b, mass, level[i]);
  PetscFunctionReturn(0);
}
