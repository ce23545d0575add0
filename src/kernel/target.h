/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * For the files that are built once for every target, with EF__TARGET its
 * name: EF__KERNEL(exp) is the target's own name of a kernel. */
#ifndef EVENFIELD_KERNEL_TARGET_H
#define EVENFIELD_KERNEL_TARGET_H

#include "kernel/kernels.h"

#define EF__KERNEL_JOIN(target, name) ef__##target##_##name
#define EF__KERNEL_OF(target, name) EF__KERNEL_JOIN(target, name)
#define EF__KERNEL(name) EF__KERNEL_OF(EF__TARGET, name)

#define EF__KERNEL_DECLARE(name, arguments) void EF__KERNEL(name) arguments;
EF__KERNEL_LIST(EF__KERNEL_DECLARE)
#undef EF__KERNEL_DECLARE

extern const ef__kernel_table EF__KERNEL(table);

#endif
