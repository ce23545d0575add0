/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the files of spectral images share. */
#ifndef EVENFIELD_CUBE_PRIVATE_H
#define EVENFIELD_CUBE_PRIVATE_H

#include "exchange/exchange_private.h"

struct ef_cube {
  char *name, *data_name;
  int descriptor;
  ef__cube_header header;
};

#endif
