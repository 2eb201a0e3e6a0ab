#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Writes C source with one array per file named and the table web_assets over them. POSIX sh, od and sed only.
set -eu
echo '#include "http/assets.h"'
n=0
for file in "$@"; do
  echo "static const unsigned char asset_$n[] = {"
  od -An -v -tx1 "$file" | sed 's/\([0-9a-f][0-9a-f]\)/0x\1,/g'
  echo "0};"
  n=$((n + 1))
done
echo 'const struct web_asset web_assets[] = {'
n=0
for file in "$@"; do
  echo "    {\"/${file#web/}\", asset_$n, sizeof asset_$n - 1},"
  n=$((n + 1))
done
echo '    {0, 0, 0}};'
