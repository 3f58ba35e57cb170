/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/memory.h"

#include <stdio.h>
#include <string.h>

/* A row of /proc/self/status, in kB. Not getrusage: its maximum may be that of the process that started this one. */
static double status_row(const char *name)
{
  static const double kilo = 1024.0;
  FILE *file = fopen("/proc/self/status", "r");
  char line[256];
  double value = 0.0;

  if (!file) return 0.0;
  while (fgets(line, sizeof line, file))
    if (!strncmp(line, name, strlen(name)) && sscanf(line + strlen(name), "%lf", &value) == 1) break;
  (void)fclose(file);
  return kilo * value;
}

double ebb_memory_now(void) { return status_row("VmRSS:"); }

double ebb_memory_peak(void) { return status_row("VmHWM:"); }
