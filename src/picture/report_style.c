/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The stylesheet of reports. Inks come from ink.c, as variables, so that charts
 * and page turn dark together; paper is always light. */
#include <stdio.h>

#include "picture/report_private.h"

static const char rules[] =
    "*{box-sizing:border-box}\n"
    "html{-webkit-text-size-adjust:100%;text-size-adjust:100%}\n"
    "body{margin:0;background:var(--paper);color:var(--text);"
    "font:1rem/1.55 sans-serif;overflow-wrap:break-word}\n"
    "header,nav,main,footer{max-width:64rem;margin:0 auto;"
    "padding:0 1.25rem}\n"
    "header{padding-top:1.5rem}\n"
    ".asked{margin:0;color:var(--soft)}\n"
    ".heard{position:absolute;width:1px;height:1px;overflow:hidden;"
    "clip-path:inset(50%)}\n"
    "h1{font-size:1.55rem;line-height:1.3;margin:.35rem 0 1rem;"
    "max-width:54rem;text-wrap:balance;padding-left:.9rem;"
    "border-left:.45rem solid var(--look-1)}\n"
    "h2{font-size:1.15rem;line-height:1.35;margin:2.2rem 0 .6rem;"
    "padding-top:.6rem;border-top:1px solid var(--faint)}\n"
    "p{max-width:46rem;margin:.6rem 0}\n"
    "nav{margin-top:1rem}\n"
    "nav ul{list-style:none;margin:0;padding:0;display:flex;flex-wrap:wrap;"
    "gap:0 1.25rem;font-size:.92rem}\n"
    "nav a{display:inline-block;padding:.35rem 0}\n"
    "a{color:var(--look-1)}\n"
    ":focus-visible{outline:3px solid var(--look-2);outline-offset:2px}\n"
    ".caution{border-left:.45rem solid var(--look-2);padding:.1rem 0 .1rem "
    ".9rem;margin:1rem 0}\n"
    "dl{margin:.6rem 0}\n"
    "dt{font-weight:bold;margin-top:.7rem}\n"
    "dd{margin:0;max-width:46rem}\n"
    "code{font:.92em/1.5 monospace;overflow-wrap:anywhere}\n"
    /* A shade at the right while there is more to scroll to; what covers it
     * moves with the table. */
    ".wide{position:relative;overflow-x:auto;margin:.8rem 0;max-width:100%;"
    "background:linear-gradient(to left,var(--paper) 1rem,transparent) "
    "right/2.5rem 100% no-repeat local,linear-gradient(to left,var(--faint),"
    "transparent) right/.6rem 100% no-repeat scroll}\n"
    "table{border-collapse:collapse;font-variant-numeric:tabular-nums}\n"
    "caption{text-align:left;color:var(--soft);padding-bottom:.3rem}\n"
    "th,td{padding:.28rem .8rem .28rem 0;text-align:right;"
    "vertical-align:top;white-space:nowrap}\n"
    "th{font-weight:bold}\n"
    "thead th{vertical-align:bottom}\n"
    "tbody th{font-weight:normal}\n"
    ".t{text-align:left}\n"
    ".g{padding-left:1.1rem}\n"
    "th[colspan]{text-align:center;border-bottom:1px solid var(--faint)}\n"
    "thead tr:last-child th,thead th[rowspan]{"
    "border-bottom:2px solid var(--soft)}\n"
    "tbody tr{border-bottom:1px solid var(--faint)}\n"
    ".charts{display:grid;gap:1rem 1.5rem;"
    "grid-template-columns:repeat(auto-fit,minmax(min(100%,24rem),1fr))}\n"
    "figure{margin:0}\n"
    "figure svg{display:block;width:100%;height:auto;max-width:36rem}\n"
    "figcaption{color:var(--soft);font-size:.92rem}\n"
    ".swatches{display:grid;gap:1rem;list-style:none;padding:0;"
    "margin:.8rem 0;grid-template-columns:"
    "repeat(auto-fill,minmax(8.5rem,1fr))}\n"
    ".swatches img{display:block;width:100%;height:auto}\n"
    "footer{color:var(--soft);font-size:.92rem;margin-top:2rem;"
    "padding-bottom:2rem}\n"
    "@media(max-width:40rem){table{font-size:.92rem}"
    "th,td{padding-right:.6rem}.g{padding-left:.6rem}"
    "tbody th{white-space:normal;min-width:6rem}}\n"
    "@media(min-width:46rem){dl{display:grid;"
    "grid-template-columns:10rem 1fr;gap:0 1rem}"
    "dt{text-align:right}dd{padding-top:.7rem}}\n"
    "@media print{nav{display:none}body{font-size:10pt}"
    "header,main,footer{max-width:none;padding:0}"
    ".wide{overflow:visible;background:none}"
    "th,td{white-space:normal;padding-right:.5rem}"
    "h2{break-after:avoid}figure,tr,dd{break-inside:avoid}"
    ".charts{grid-template-columns:1fr 1fr}"
    ".swatches{grid-template-columns:repeat(5,1fr);gap:.5rem}"
    ".swatches,img{print-color-adjust:exact;-webkit-print-color-adjust:exact}"
    "@page{margin:1.6cm}}\n";

static void put_inks(ef__report_writer *w, bool is_dark) {
  ef__report_put(w, ":root{color-scheme:");
  ef__report_put(w, is_dark ? "dark" : "light");
  for (int i = 0; i < EF__INKS; ++i) {
    const ef__ink *ink = ef__ink_at(i);
    char text[60];
    snprintf(text, sizeof text, ";--%s:#%06x", ink->name,
             (unsigned)(is_dark ? ink->dark : ink->light));
    ef__report_put(w, text);
  }
  ef__report_put(w, "}");
}

void ef__report_style(ef__report_writer *w) {
  put_inks(w, false);
  ef__report_put(w, "\n@media screen and (prefers-color-scheme:dark){");
  put_inks(w, true);
  ef__report_put(w, "}\n");
  ef__report_put(w, rules);
}
