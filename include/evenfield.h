/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The whole public interface of Evenfield. Each module's header is also
 * usable alone. */
#ifndef EVENFIELD_H
#define EVENFIELD_H

#include <evenfield/base.h>
#include <evenfield/spectrum.h>
#include <evenfield/observer.h>
#include <evenfield/colour.h>
#include <evenfield/difference.h>
#include <evenfield/device.h>
#include <evenfield/match.h>
#include <evenfield/stimulus.h>
#include <evenfield/panel.h>
#include <evenfield/exchange.h>
#include <evenfield/image.h>
#include <evenfield/picture.h>

#endif
