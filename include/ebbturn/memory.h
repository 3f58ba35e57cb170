/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). What this process holds in memory, as the system counts it: resident pages, libraries included. */
#ifndef EBBTURN_MEMORY_H
#define EBBTURN_MEMORY_H

/* Bytes now, and the most since the program was started; 0 where the system does not tell. */
double ebb_memory_now(void);
double ebb_memory_peak(void);

#endif
