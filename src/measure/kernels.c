/* SPDX-License-Identifier: BSD-2-Clause
 *
 * One site at a time, all samples in the innermost loop: every array is contiguous in the sample. About 60 flops per
 * site and sample beside the 12 x modes of the sum that produced them. */
#include "base/wide.h"
#include "sheet_impl.h"

#include <math.h>

/* What the sums of one site are weighted with. */
struct site_weights {
  double cell;    /* measure of the site */
  double a4;      /* a^4 = V^{4/3}, V in units of the model's */
  double density; /* V^-power of the clock's density */
  bool linear;    /* the clock moves states by exp(i H t) */
};

/* Probability near the edge, in the last window of ratio edge_ratio and in the one below it. */
static void edges(const struct site_weights *at, double v, double v_max, bool outer, const struct ebb_site_rows *r,
                  PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  const bool last = v > v_max / sheet->edge_ratio;
  double *plain = sheet->sum[last ? EBB_SUM_EDGE_0 : EBB_SUM_INNER_0] + s0;
  double *first = sheet->sum[last ? EBB_SUM_EDGE_V : EBB_SUM_INNER_V] + s0;
  double *second = sheet->sum[last ? EBB_SUM_EDGE_V2 : EBB_SUM_INNER_V2] + s0;
  double *dressed = sheet->sum[last ? EBB_SUM_EDGE_DRESSED : EBB_SUM_INNER_DRESSED] + s0;
  const double w = at->cell;

  for (PetscInt s = 0; s < m; s++) {
    const double p = w * (r->psi[0][s] * r->psi[0][s] + r->psi[1][s] * r->psi[1][s]);

    plain[s] += p;
    first[s] += v * p;
    second[s] += v * v * p;
    dressed[s] += at->a4 * w * (r->quarter[0][s] * r->quarter[0][s] + r->quarter[1][s] * r->quarter[1][s]);
    if (v > 0.9 * v_max || outer) sheet->sum[EBB_SUM_EDGE][s0 + s] += p;
  }
}

/* Sums of one site alone. */
EBB_WIDE static void diagonal(const struct site_weights *at, double v, double v_max, bool outer,
                              const struct ebb_site_rows *r, PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  const double *restrict pr = r->psi[0], *restrict pi = r->psi[1], *restrict rr = r->root[0], *restrict ri = r->root[1];
  const double *restrict qr = r->quarter[0], *restrict qi = r->quarter[1];
  const double w = at->cell, lnv = log(v), v2 = v * v;
  const double f = sheet->bounded_scale > 0.0 ? atan(v / sheet->bounded_scale) : v;
  double *restrict norm = sheet->sum[EBB_SUM_NORM] + s0, *restrict s_v = sheet->sum[EBB_SUM_V] + s0;
  double *restrict s_v2 = sheet->sum[EBB_SUM_V2] + s0, *restrict s_l = sheet->sum[EBB_SUM_LNV] + s0;
  double *restrict s_l2 = sheet->sum[EBB_SUM_LNV2] + s0, *restrict root = sheet->sum[EBB_SUM_ROOT] + s0;
  double *restrict theta = sheet->sum[EBB_SUM_THETA_ROOT] + s0, *restrict sandwich = sheet->sum[EBB_SUM_SANDWICH] + s0;
  double *restrict slope = sheet->sum[EBB_SUM_SLOPE] + s0, *restrict slope2 = sheet->sum[EBB_SUM_SLOPE2] + s0;
  double *restrict inverse = sheet->sum[EBB_SUM_INVERSE] + s0, *restrict dressed = sheet->sum[EBB_SUM_DRESSED] + s0;

  for (PetscInt s = 0; s < m; s++) {
    const double p = w * (pr[s] * pr[s] + pi[s] * pi[s]);
    const double flow = -2.0 * w * (pr[s] * ri[s] - pi[s] * rr[s]); /* 2 Re conj(psi) i root */

    norm[s] += p;
    s_v[s] += v * p;
    s_v2[s] += v2 * p;
    s_l[s] += lnv * p;
    s_l2[s] += lnv * lnv * p;
    slope[s] += f * flow;
    slope2[s] += v2 * flow;
  }
  for (PetscInt s = 0; s < m; s++) {
    const double r2 = w * (rr[s] * rr[s] + ri[s] * ri[s]), q2 = w * (qr[s] * qr[s] + qi[s] * qi[s]);

    root[s] += w * (pr[s] * rr[s] + pi[s] * ri[s]);
    theta[s] += r2;
    sandwich[s] += at->density * (at->linear ? w * (pr[s] * rr[s] + pi[s] * ri[s]) : r2);
    inverse[s] += q2;
    dressed[s] += at->a4 * q2;
  }
  if (v > v_max / (sheet->edge_ratio * sheet->edge_ratio) || outer) edges(at, v, v_max, outer, r, s0, m, sheet);
}

/* Sums that few models have. */
static void diagonal_more(const struct ebb_lattice *lattice, double cell, double v, bool last,
                          const struct ebb_site_rows *r, PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  const struct ebb_rows *rows = &lattice->rows;
  const bool powers = rows->volume_power != 1.0, potential = rows->band == 1 && ebb_rows_has_potential(rows);
  const double volume = powers ? ebb_rows_volume(rows, v) : 0.0, u = potential ? ebb_rows_potential(rows, v) : 0.0;
  const double bounded = sheet->bounded_scale > 0.0 ? atan(v / sheet->bounded_scale) : 0.0;

  if (!powers && !potential && bounded == 0.0 && !last) return;
  for (PetscInt s = 0; s < m; s++) {
    const double p = cell * (r->psi[0][s] * r->psi[0][s] + r->psi[1][s] * r->psi[1][s]);

    sheet->sum[EBB_SUM_THETA][s0 + s] += u * p;
    sheet->sum[EBB_SUM_VOLUME][s0 + s] += volume * p;
    sheet->sum[EBB_SUM_VOLUME2][s0 + s] += volume * volume * p;
    sheet->sum[EBB_SUM_ARCTAN][s0 + s] += bounded * p;
    if (last) sheet->sum[EBB_SUM_LAST][s0 + s] += p;
  }
}

EBB_WIDE static void most_probable(double v, const struct ebb_site_rows *r, PetscInt s0, PetscInt m,
                                   struct ebb_sheet *sheet, double *restrict best)
{
  double *restrict mode = sheet->mode + s0;

  for (PetscInt s = 0; s < m; s++) {
    const double p = r->psi[0][s] * r->psi[0][s] + r->psi[1][s] * r->psi[1][s];
    if (p > best[s0 + s]) {
      best[s0 + s] = p;
      mode[s] = v;
    }
  }
}

/* Quadratic forms of a five-point operator, by its elements, and shifts; v: this site. With holonomies of the
 * connection the flat operator hops two sites, in the gauge i^n of the rows: the difference becomes a sum. */
static void links_five(const struct ebb_lattice *lattice, double v, const struct ebb_site_rows *r, PetscInt s0,
                       PetscInt m, struct ebb_sheet *sheet)
{
  const struct ebb_rows *rows = &lattice->rows;
  const struct ebb_prescription *flat = lattice->rows.prescription;
  const double step = rows->step, over = 1.0 / rows->scale, here = 1.0 / ebb_rows_volume(rows, v);
  const double d0 = over * ebb_rows_diagonal(rows, v), d1 = 2.0 * over * ebb_rows_offdiagonal(rows, v);
  const double d2 = 2.0 * over * ebb_rows_second(rows, v);
  const double y1 = here / ebb_rows_volume(rows, v + step), y2 = here / ebb_rows_volume(rows, v + 2.0 * step);
  const bool split = flat->split;
  const double a = split ? 0.0 : here / sqrt(flat->measure(v)), hop = split ? 0.0 : flat->hop(v);
  const double b = split ? 0.0 : 1.0 / (sqrt(flat->measure(v + 4.0)) * ebb_rows_volume(rows, v + 4.0));
  const double edge = !split && v <= 4.0 ? flat->edge(v) : 0.0;

  for (PetscInt s = 0; s < m; s++) {
    const double pr = r->psi[0][s], pi = r->psi[1][s];
    const double p = pr * pr + pi * pi, one = r->next[0][s] * pr + r->next[1][s] * pi;
    const double two = r->after[0][s] * pr + r->after[1][s] * pi;
    const double xr = b * r->after[0][s] + a * pr, xi = b * r->after[1][s] + a * pi;

    sheet->sum[EBB_SUM_THETA][s0 + s] += d0 * p + d1 * one + d2 * two;
    sheet->sum[EBB_SUM_DENSITY][s0 + s] +=
        split ? d0 * here * here * p + d1 * y1 * one + d2 * y2 * two : hop * (xr * xr + xi * xi) + edge * a * a * p;
    sheet->sum[EBB_SUM_SHIFT_RE][s0 + s] += step == 4.0 ? one : split ? two : -two;
  }
}

/* Quadratic forms and shifts of the link n -> n + 1 (and n + 2). a, b: 1/sqrt(B) at its two ends. */
EBB_WIDE static void links(const struct ebb_lattice *lattice, double v, const struct ebb_site_rows *r, PetscInt s0,
                           PetscInt m, struct ebb_sheet *sheet)
{
  const struct ebb_rows *rows = &lattice->rows;
  const struct ebb_prescription *flat = lattice->rows.prescription;
  const double c = ebb_rows_hop(rows, v), d = flat->hop(v);
  const double a = 1.0 / sqrt(ebb_rows_measure(rows, v)), b = 1.0 / sqrt(ebb_rows_measure(rows, v + 4.0));
  const double av = 1.0 / sqrt(flat->measure(v)) / ebb_rows_volume(rows, v);
  const double bv = 1.0 / sqrt(flat->measure(v + 4.0)) / ebb_rows_volume(rows, v + 4.0);
  const double *restrict pr = r->psi[0], *restrict pi = r->psi[1], *restrict nr = r->next[0], *restrict ni = r->next[1];
  const double *restrict fr = r->after[0], *restrict fi = r->after[1];
  double *restrict theta = sheet->sum[EBB_SUM_THETA] + s0, *restrict density = sheet->sum[EBB_SUM_DENSITY] + s0;
  double *restrict re = sheet->sum[EBB_SUM_SHIFT_RE] + s0, *restrict im = sheet->sum[EBB_SUM_SHIFT_IM] + s0;
  double *restrict two = sheet->sum[EBB_SUM_SHIFT2] + s0;

  for (PetscInt s = 0; s < m; s++) {
    const double xr = b * nr[s] - a * pr[s], xi = b * ni[s] - a * pi[s];
    const double yr = bv * nr[s] - av * pr[s], yi = bv * ni[s] - av * pi[s];

    theta[s] += c * (xr * xr + xi * xi);
    density[s] += d * (yr * yr + yi * yi);
    re[s] += nr[s] * pr[s] + ni[s] * pi[s];
    im[s] += nr[s] * pi[s] - ni[s] * pr[s];
    two[s] += fr[s] * pr[s] + fi[s] * pi[s];
  }
}

/* The same of the links that a node stands for; r->next: the difference of psi/sqrt(B) along its link. 1/V differs by
 * expm1(-power log(1 + step/v))/V. */
static void links_node(const struct ebb_lattice *lattice, double w, double v, const struct ebb_site_rows *r,
                       PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  const struct ebb_rows *rows = &lattice->rows;
  const struct ebb_prescription *flat = rows->prescription;
  const double c = w * ebb_rows_hop(rows, v), d = w * flat->hop(v), over = 1.0 / sqrt(ebb_rows_measure(rows, v));
  const double root = w * sqrt(ebb_rows_measure(rows, v + 4.0)), here = 1.0 / ebb_rows_volume(rows, v);
  const double next = 1.0 / ebb_rows_volume(rows, v + 4.0), turn = here * expm1(-rows->volume_power * log1p(4.0 / v));

  for (PetscInt s = 0; s < m; s++) {
    const double pr = r->psi[0][s], pi = r->psi[1][s], dr = r->next[0][s], di = r->next[1][s];
    const double yr = next * dr + turn * over * pr, yi = next * di + turn * over * pi;
    const double nr = root * (over * pr + dr), ni = root * (over * pi + di);

    sheet->sum[EBB_SUM_THETA][s0 + s] += c * (dr * dr + di * di);
    sheet->sum[EBB_SUM_DENSITY][s0 + s] += d * (yr * yr + yi * yi);
    sheet->sum[EBB_SUM_SHIFT_RE][s0 + s] += nr * pr + ni * pi;
    sheet->sum[EBB_SUM_SHIFT_IM][s0 + s] += nr * pi - ni * pr;
    sheet->sum[EBB_SUM_SHIFT2][s0 + s] += w * (r->after[0][s] * pr + r->after[1][s] * pi);
  }
}

void ebb_kernel_lattice(const struct ebb_lattice *lattice, int arm, PetscInt n, const struct ebb_site_rows *rows,
                        PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  const double v = ebb_lattice_place(lattice, arm, n), v_max = ebb_lattice_last(lattice, arm);
  const struct ebb_clock *clock = lattice->rows.clock;
  const double volume = ebb_rows_volume(&lattice->rows, v);
  const struct site_weights at = {.cell = ebb_lattice_measure(lattice, arm, n),
                                  .a4 = cbrt(volume * volume * volume * volume),
                                  .density = clock->root && clock->density_power == 2.0
                                                 ? 1.0 / (volume * volume)
                                                 : pow(volume, -clock->density_power),
                                  .linear = !clock->root};

  diagonal(&at, v, v_max, false, rows, s0, m, sheet);
  diagonal_more(lattice, at.cell, v, !lattice->grading && n + 1 == lattice->sites[arm], rows, s0, m, sheet);
  most_probable(v, rows, s0, m, sheet, sheet->sum[EBB_SUMS]);
  if (lattice->rows.band == 2)
    links_five(lattice, v, rows, s0, m, sheet);
  else if (n >= ebb_lattice_plain(lattice, arm))
    links_node(lattice, at.cell, v, rows, s0, m, sheet);
  else
    links(lattice, v, rows, s0, m, sheet);
}

void ebb_kernel_first(const struct ebb_lattice *lattice, const double *const right[2], const double *const left[2],
                      PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  const struct ebb_rows *rows = &lattice->rows;
  const struct ebb_prescription *flat = lattice->rows.prescription;
  const double c = lattice->rows.half ? lattice->edge : lattice->cross, v = lattice->first[0], w = lattice->first[1];
  const double d = lattice->rows.half ? flat->edge(lattice->rows.sector) : flat->hop(lattice->rows.sector - 4.0);
  const double a = 1.0 / sqrt(ebb_rows_measure(rows, v)), b = left ? 1.0 / sqrt(ebb_rows_measure(rows, w)) : 0.0;
  const double av = 1.0 / sqrt(flat->measure(v)) / ebb_rows_volume(rows, v);
  const double bv = left ? 1.0 / sqrt(flat->measure(w)) / ebb_rows_volume(rows, w) : 0.0;

  for (PetscInt s = 0; s < m; s++) {
    const double lr = left ? left[0][s] : 0.0, li = left ? left[1][s] : 0.0;
    const double xr = a * right[0][s] - b * lr, xi = a * right[1][s] - b * li;
    /* v^-1 is odd: on the left arm it is -1/|v| */
    const double yr = av * right[0][s] + bv * lr, yi = av * right[1][s] + bv * li;

    sheet->sum[EBB_SUM_THETA][s0 + s] += c * (xr * xr + xi * xi);
    sheet->sum[EBB_SUM_DENSITY][s0 + s] += d * (yr * yr + yi * yi);
    sheet->sum[EBB_SUM_FIRST][s0 + s] += right[0][s] * right[0][s] + right[1][s] * right[1][s] + lr * lr + li * li;
    if (left) sheet->sum[EBB_SUM_SHIFT_RE][s0 + s] += right[0][s] * lr + right[1][s] * li;
  }
}

void ebb_kernel_grid(const struct ebb_lattice *lattice, double kappa, PetscInt n, const struct ebb_site_rows *rows,
                     PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  const double w = lattice->dx, v = exp(lattice->lnv_min + (double)n * w);
  const double v_max = exp(lattice->lnv_min + (double)(lattice->sites[0] - 1) * w);
  const PetscInt margin =
      PetscMax(lattice->sites[0] / 50, 1); /* outermost two percent at either end: the grid is periodic */
  const double *restrict pr = rows->psi[0], *restrict pi = rows->psi[1];
  const double *restrict dr = rows->slope[0], *restrict di = rows->slope[1];

  const struct site_weights at = {.cell = w, .a4 = cbrt(v * v * v * v), .density = 1.0 / (v * v)};

  diagonal(&at, v, v_max, n < margin || n >= lattice->sites[0] - margin, rows, s0, m, sheet);
  most_probable(v, rows, s0, m, sheet, sheet->sum[EBB_SUMS]);
  for (PetscInt s = 0; s < m; s++) {
    const double er = dr[s] - pr[s], ei = di[s] - pi[s]; /* v (psi/v)' */
    const double hr = dr[s] - 0.5 * pr[s], hi = di[s] - 0.5 * pi[s];

    sheet->sum[EBB_SUM_THETA][s0 + s] += kappa * kappa * w * (dr[s] * dr[s] + di[s] * di[s]);
    sheet->sum[EBB_SUM_DENSITY][s0 + s] += kappa * kappa * w * (er * er + ei * ei) / (v * v);
    /* b = -2 v^{-1/2} (-i d_x) v^{-1/2}: positive where the universe expands; its square below */
    sheet->sum[EBB_SUM_SHIFT_IM][s0 + s] += -2.0 * w * (pr[s] * di[s] - pi[s] * dr[s]) / v;
    sheet->sum[EBB_SUM_SHIFT_RE][s0 + s] += 4.0 * w * (hr * hr + hi * hi) / (v * v);
  }
}
