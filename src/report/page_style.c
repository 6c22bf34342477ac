/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/page_style.h"

/*
 * One column on a phone; map beside words where there is room; ink on paper. Every colour of text
 * stands at least 4.5 : 1 against what it stands on, in either scheme (WCAG 2.1, 1.4.3), lines and
 * marks 3 : 1 (1.4.11). Conductors have the colours of BS 7671, table 51: brown, blue, green and
 * yellow; nothing is told by colour alone.
 */
static const char *const sheet[] = {
    ":root{color-scheme:light dark;--paper:#fdfcf9;--ink:#1d1d22;--soft:#54545d;--rule:#c9c6bd;"
    "--card:#f3f1ea;--chance:#5a2d82;--chance-fill:#dcc8f0;--danger:#8c1c13;--danger-fill:#fdeae7;"
    "--fit:#0a5a6e;--fit-fill:#b9dde6;--sound:#66645c;--sound-fill:#e5e2d8;--line:#7b4420;"
    "--neutral:#1d58a8;--cpc:#2c7a2c;--stripe:#e8d21d;--link:#1d1d22}\n",
    "@media (prefers-color-scheme:dark){:root{--paper:#15161a;--ink:#eceae4;--soft:#b5b3ac;"
    "--rule:#494a52;--card:#1f2026;--chance:#d8baf7;--chance-fill:#4b3369;--danger:#ffb9ae;"
    "--danger-fill:#3a1512;--fit:#82d2e5;--fit-fill:#1c4552;--sound:#a3a199;--sound-fill:#2d2e32;"
    "--line:#d99f69;--neutral:#8abaf6;--cpc:#67c267;--stripe:#f0dc3c;--link:#eceae4}}\n",
    "*{box-sizing:border-box}\n",
    "html{font:16px/1.45 system-ui,-apple-system,'Segoe UI',Roboto,'DejaVu Sans',sans-serif;"
    "background:var(--paper);color:var(--ink);-webkit-text-size-adjust:100%}\n",
    "body{margin:0 auto;padding:0 16px 40px;max-width:1120px;overflow-wrap:anywhere}\n",
    "h1{font-size:1.6rem;line-height:1.15;margin:18px 0 4px}\n",
    "h2{font-size:1.15rem;margin:0 0 10px}\n",
    "h3{font-size:1rem;margin:18px 0 6px}\n",
    "p{margin:0 0 8px}ul,ol{margin:0;padding:0}ol{padding-left:1.6em}\n",
    "a{color:var(--fit);text-underline-offset:3px}\n",
    "a:focus-visible,summary:focus-visible,.wide:focus-visible{outline:3px solid var(--fit);"
    "outline-offset:2px}\n",
    ".about,.job-note,figcaption,td.soft{color:var(--soft);font-size:.92rem}\n",
    ".job-note{border-left:3px solid var(--rule);padding-left:10px;max-width:70ch}\n",
    "nav ul{display:flex;flex-wrap:wrap;gap:4px 18px;list-style:none}\n",
    "nav a{display:inline-block;padding:9px 0}\n",
    "section{border-top:2px solid var(--ink);padding-top:12px;margin-top:26px}\n",
    ".alarm{border:3px solid var(--danger);border-left-width:12px;background:var(--danger-fill);"
    "padding:12px 14px}\n",
    ".alarm h2,.alarm .number{color:var(--danger)}\n",
    ".chances{list-style:none}\n",
    ".chances li{display:grid;grid-template-columns:3.7em minmax(0,1fr);column-gap:12px;"
    "padding:7px 0;border-top:1px solid var(--rule)}\n",
    ".chances li:first-child{border-top:0}\n",
    ".chances .number{font-weight:700;color:var(--chance);text-align:right}\n",
    ".chances .words{grid-column:2}\n",
    ".letter{font-weight:700;margin-right:.5em}\n",
    "svg.bar{display:block;width:100%;height:5px;margin-top:5px}\n",
    "svg.bar rect{fill:var(--chance)}\n",
    ".first{font-size:1.15rem;font-weight:700;max-width:60ch}\n",
    ".dots{padding-left:1.2em}.dots li{margin-bottom:4px}\n",
    "figure{margin:0;min-width:0}\n",
    "figure svg{display:block;width:100%;height:auto}\n",
    "figcaption{margin-top:8px}figcaption ul{list-style:none}figcaption li{margin-bottom:3px}\n",
    ".beside{display:grid;gap:20px;grid-template-columns:minmax(0,1fr)}\n",
    ".plots{display:grid;gap:24px;grid-template-columns:minmax(0,1fr)}\n",
    "svg.map{max-width:460px;margin:0 auto}svg.connect{max-width:380px}svg.calibration"
    "{max-width:460px}\n",
    "@media (min-width:860px){.beside{grid-template-columns:minmax(0,5fr) minmax(0,6fr);"
    "gap:36px}.plots{grid-template-columns:minmax(0,1fr) minmax(0,1fr)}}\n",
    ".wide{overflow-x:auto}\n",
    "table{border-collapse:collapse;width:100%}\n",
    "section>table,details>table{max-width:44rem}\n",
    "th,td{padding:5px 6px;text-align:right;vertical-align:top;border-top:1px solid var(--rule);"
    "font-variant-numeric:tabular-nums}\n",
    "th:first-child,td:first-child,.left{text-align:left}\n",
    "tbody th{font-weight:400}tbody th[colspan]{font-weight:700;padding-top:14px;border-top:0}\n",
    "thead th,thead td{overflow-wrap:normal;border-top:0;border-bottom:2px solid var(--ink)}\n",
    "tr.again{background:var(--card)}\n",
    "details{margin-top:14px}summary{cursor:pointer;padding:9px 0;font-weight:700}\n",
    "footer{margin-top:30px;color:var(--soft);font-size:.92rem}\n",
    "svg text{font-family:system-ui,-apple-system,'Segoe UI',Roboto,'DejaVu Sans',sans-serif;"
    "fill:var(--ink)}\n",
    "path{fill:none;stroke-linejoin:round;stroke-linecap:butt}\n",
    ".ring{stroke:var(--ink);stroke-width:3.5}\n",
    ".line,.neutral,.cpc,.cpc-stripe{stroke-width:3}\n",
    ".line{stroke:var(--line)}.neutral{stroke:var(--neutral)}.cpc{stroke:var(--cpc)}\n",
    ".cpc-stripe{stroke:var(--stripe);stroke-dasharray:4 5}\n",
    ".cut{fill:var(--paper);stroke:none}\n",
    ".resistor{fill:var(--paper);stroke:var(--ink);stroke-width:1.8}\n",
    ".finding-1,.finding-2,.finding-3{stroke:var(--fit);stroke-width:3}\n",
    ".finding-2{stroke-dasharray:7 4}.finding-3{stroke-dasharray:2 4}\n",
    ".bridge{stroke:var(--fit);stroke-width:2.5;stroke-dasharray:9 3}\n",
    ".leader{stroke:var(--soft);stroke-width:1}\n",
    ".point{fill:var(--paper);stroke:var(--ink);stroke-width:2.5}\n",
    ".seen{fill:var(--ink);stroke:var(--ink);stroke-width:2.5}\n",
    ".seen-mark{stroke:var(--paper);stroke-width:1.8}\n",
    ".chance{fill:var(--chance-fill);stroke:var(--chance);stroke-width:1.8}\n",
    ".board{fill:var(--card);stroke:var(--ink);stroke-width:2}\n",
    ".name{font-weight:600}svg text.note,svg text.tick{fill:var(--soft)}\n",
    "svg text.number{fill:var(--chance);font-weight:700}\n",
    "svg text.letter{fill:var(--fit);font-weight:700}\n",
    ".axis{stroke:var(--ink);stroke-width:1.4}.grid{stroke:var(--rule);stroke-width:1}\n",
    ".sound{stroke:var(--sound);stroke-width:2;stroke-dasharray:3 4}\n",
    ".sound-band{fill:var(--sound-fill);stroke:none}\n",
    ".fit{stroke:var(--fit);stroke-width:2.2}\n",
    ".fit-band{fill:var(--fit-fill);stroke:none;fill-opacity:.75}\n",
    ".read{fill:var(--ink);stroke:var(--paper);stroke-width:.8}\n",
    ".suspect{fill:none;stroke:var(--danger);stroke-width:2.2}\n",
    ".meter{fill:var(--paper);stroke:var(--ink);stroke-width:2.5}\n",
    ".lead{stroke:var(--ink);stroke-width:1.6;stroke-dasharray:5 3}\n",
    ".link{stroke:var(--link);stroke-width:5}\n",
    ".terminal{fill:var(--paper);stroke:var(--ink);stroke-width:2}\n",
    "@page{size:A4;margin:14mm}\n",
    "@media print{:root{--paper:#fff}html{font-size:10.5pt}body{padding:0;max-width:none}nav{display:none}"
    "section{margin-top:14pt}figure,.alarm,li,tr,.keep{break-inside:avoid}"
    "h2,h3,thead,summary{break-after:avoid}"
    ".beside{grid-template-columns:minmax(0,1fr) minmax(0,1fr);gap:16pt}"
    ".plots{grid-template-columns:minmax(0,1fr) minmax(0,1fr)}"
    "svg.map{max-height:215mm}"
    "details::details-content{content-visibility:visible;display:block;height:auto}"
    "a{color:inherit;text-decoration:none}"
    "*{-webkit-print-color-adjust:exact;print-color-adjust:exact}}\n",
};

static void meta(struct markup *markup, const char *name, const char *content)
{
    markup_open(markup, "meta");
    markup_attribute(markup, "name", name);
    markup_attribute(markup, "content", content);
    markup_void(markup, "meta");
}

void page_head(struct markup *markup, const char *title)
{
    markup_open(markup, "html");
    markup_attribute(markup, "lang", "en");
    markup_open(markup, "head");
    markup_open(markup, "meta");
    markup_attribute(markup, "charset", "utf-8");
    markup_void(markup, "meta");
    markup_open(markup, "meta");
    markup_attribute(markup, "http-equiv", "Content-Security-Policy");
    markup_attribute(markup, "content",
                     "default-src 'none'; style-src 'unsafe-inline'; base-uri 'none'; "
                     "form-action 'none'");
    markup_void(markup, "meta");
    meta(markup, "viewport", "width=device-width, initial-scale=1");
    meta(markup, "color-scheme", "light dark");
    meta(markup, "referrer", "no-referrer");
    markup_element(markup, "title", NULL, title);
    markup_style(markup, sheet, sizeof sheet / sizeof sheet[0]);
    markup_close(markup);
    markup_open(markup, "body");
}

void page_foot(struct markup *markup)
{
    markup_open(markup, "footer");
    markup_textf(markup, "Written by ringfettle %s. It needs no network.", rf_version());
    markup_close(markup);
    markup_close(markup);
    markup_close(markup);
}

void page_bar(struct markup *markup, double share)
{
    markup_open(markup, "svg");
    markup_attribute(markup, "class", "bar");
    markup_attribute(markup, "viewBox", "0 0 100 5");
    markup_attribute(markup, "preserveAspectRatio", "none");
    markup_attribute(markup, "aria-hidden", "true");
    markup_open(markup, "rect");
    markup_attributef(markup, "width", "%.1f", 100 * share);
    markup_attribute(markup, "height", "5");
    markup_void(markup, "rect");
    markup_close(markup);
}
