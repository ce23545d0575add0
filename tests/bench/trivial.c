/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a program costs that does nothing. */
int main(void) {
  return 0;
}
