/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the files of profiles share: profile*.c, the only ones that call
 * lcms2. */
#ifndef EVENFIELD_PROFILE_PRIVATE_H
#define EVENFIELD_PROFILE_PRIVATE_H

#include <evenfield/device.h>

#include <lcms2.h>

/* ---- Bytes (profile_bytes.c, without lcms2) ------------------------------ */

/** Checks what lcms2 would take on trust: the header, that every tag lies in
 * the profile, and that every table lies in its tag, so that no size is
 * believed that is not there. `*size` receives the length that the header
 * gives. */
ef_status ef__profile_check_bytes(const char *name, const unsigned char *bytes,
                                  size_t length, size_t *size, ef_error *error);

/* ---- Opening (profile_open.c) -------------------------------------------- */

/** lcms2 with a context of its own, which keeps the first complaint. */
typedef struct ef__cms {
  cmsContext context;
  char complaint[160];
} ef__cms;

/** A context in `cms`, which must not move while it is used. */
ef_status ef__cms_start(ef__cms *cms, ef_error *error);
void ef__cms_end(ef__cms *cms);
/** What lcms2 complained of, as ": ..." or "". */
const char *ef__cms_complaint(const ef__cms *cms);

struct ef_profile {
  char *name;
  unsigned char *bytes;
  size_t length;
  ef_profile_info info;
  cmsColorSpaceSignature space;
  cmsProfileClassSignature device_class;
  char description[256];
  char missing[96];
};

/** The profile opened again in `cms`; close with cmsCloseProfile. */
cmsHPROFILE ef__profile_open(const ef_profile *profile, ef__cms *cms,
                             ef_error *error);
/** lcms2's number of an intent. */
cmsUInt32Number ef__profile_intent(ef_intent intent);

/* ---- Transforms (profile_transform.c) ------------------------------------ */

/** Factor from [0, 1] to what lcms2 takes for device values of a space in
 * double precision: 100 for inks, else 1. */
double ef__profile_unit(cmsColorSpaceSignature space);
/** Its format of double-precision values of a space. */
cmsUInt32Number ef__profile_format(cmsColorSpaceSignature space, size_t n);
/** From a profile's device values to X, Y, Z (Y = 1) in `cms`; NULL when there
 * is no such transform. EF_NO_ANSWER. */
cmsHTRANSFORM ef__profile_to_xyz(const ef_profile *profile, ef__cms *cms,
                                 ef_intent intent, bool compensate,
                                 ef_error *error);

#endif
