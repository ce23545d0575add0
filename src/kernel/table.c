/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The kernels of one target. */
#include "kernel/target.h"

#define TEXT_OF(target) #target
#define TEXT(target) TEXT_OF(target)

const ef__kernel_table EF__KERNEL(table) = {
    .target = TEXT(EF__TARGET),
#define MEMBER(name, arguments) .name = EF__KERNEL(name),
    EF__KERNEL_LIST(MEMBER)
#undef MEMBER
};
