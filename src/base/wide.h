/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). EBB_WIDE before a function: compiled for wide vectors too, and the widest that the processor has are
 * taken at run time. For loops of one element after the other that do not depend on each other: as nothing is
 * contracted (see the build's flags), their width changes no digit. Sanitizers do not get along with such functions. */
#ifndef EBBTURN_BASE_WIDE_H
#define EBBTURN_BASE_WIDE_H

#if defined(__x86_64__) && defined(__gnu_linux__) && defined(__GNUC__) && !defined(__clang__) &&                       \
    !defined(__SANITIZE_ADDRESS__)
#define EBB_WIDE __attribute__((target_clones("avx512f", "avx2", "default"), optimize("O3")))
#else
#define EBB_WIDE
#endif

#endif
