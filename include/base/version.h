/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The program's version, as study files and reports name it. */
#ifndef EVENHAND_BASE_VERSION_H
#define EVENHAND_BASE_VERSION_H
#define EVENHAND_VERSION "0.1"
#endif
