/** Style of the report: light and dark by the reader's setting, one column in print. Sizes in rem, colours as variables. */
export const REPORT_STYLE = `
:root{color-scheme:light dark;--ink:#1c2733;--soft:#566473;--page:#f5f6f4;--card:#fff;--rule:#d9dedf;--mark:#1d6a96;--warn:#8a4b08;--warn-page:#fff4e2}
@media (prefers-color-scheme:dark){:root{--ink:#dfe6ec;--soft:#9aa8b5;--page:#10171d;--card:#182129;--rule:#2c3843;--mark:#7cbfe4;--warn:#f0b964;--warn-page:#2b2214}}
*{box-sizing:border-box}
body{margin:0;background:var(--page);color:var(--ink);font:1rem/1.5 system-ui,'Segoe UI',Roboto,'Helvetica Neue',Arial,sans-serif;font-variant-numeric:tabular-nums}
main,header,footer{max-width:76rem;margin:0 auto;padding:0 1.5rem}
header{padding-top:2.25rem}
.kind{color:var(--mark);font-weight:600;letter-spacing:.04em;margin:0;font-size:.9rem}
h1{font-size:2.1rem;line-height:1.2;margin:.15rem 0 .3rem;font-weight:650;overflow-wrap:anywhere}
.under{color:var(--soft);margin:0 0 1.4rem}
h2{font-size:1.3rem;margin:2.4rem 0 .8rem;padding-top:.6rem;border-top:2px solid var(--rule);font-weight:650}
.figures{display:grid;grid-template-columns:repeat(4,1fr);gap:.9rem;margin:0;padding:0}
.figures>div{background:var(--card);border:1px solid var(--rule);border-top:3px solid var(--mark);border-radius:4px;padding:.7rem .9rem}
.figures dt{color:var(--soft);font-size:.88rem}
.figures dd{margin:.1rem 0 0;font-size:1.42rem;font-weight:600;line-height:1.25}
.figures dd small{font-size:.95rem;font-weight:400;color:var(--soft)}
.figures .note{font-size:.84rem;font-weight:400;color:var(--soft);line-height:1.35}
.plots{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(30rem,100%),1fr));gap:1.2rem}
figure{margin:0;background:var(--card);border:1px solid var(--rule);border-radius:4px;padding:1rem 1rem .8rem;break-inside:avoid}
figure.wide{grid-column:1/-1}
figure svg{display:block;max-width:100%;height:auto;margin:0 auto;color:var(--ink)}
figure.wide svg{width:100%;max-width:60rem}
figcaption{color:var(--soft);font-size:.92rem;margin-top:.6rem}
figcaption b{color:var(--ink)}
.scroll{overflow-x:auto}
table{border-collapse:collapse;width:100%;font-size:.93rem;background:var(--card);border:1px solid var(--rule)}
th,td{text-align:left;padding:.36rem .7rem;border-bottom:1px solid var(--rule);vertical-align:top}
td{overflow-wrap:anywhere}
thead th{color:var(--soft);font-weight:600;border-bottom-width:2px}
tbody th{font-weight:500}
.number{text-align:right;white-space:nowrap;overflow-wrap:normal}
.quiet{color:var(--soft)}
.changed td{font-weight:600}
tr.step th{padding-left:1.9rem;font-weight:400;color:var(--soft)}
ul.plain{padding-left:1.2rem;margin:.4rem 0}
.warnings{background:var(--warn-page);border-left:4px solid var(--warn);padding:.5rem 1rem;border-radius:0 4px 4px 0}
.caution{border:1px solid var(--rule);background:var(--card);border-radius:4px;padding:.7rem 1rem;margin:.9rem 0}
code{overflow-wrap:anywhere;font-family:ui-monospace,Consolas,'DejaVu Sans Mono',monospace;font-size:.88em}
footer{color:var(--soft);font-size:.88rem;padding-top:1.4rem;padding-bottom:2.5rem}
@media (max-width:54rem){.figures{grid-template-columns:repeat(auto-fit,minmax(10rem,1fr))}}
@media print{@page{margin:14mm}
:root{color-scheme:light;--ink:#000;--soft:#444;--page:#fff;--card:#fff;--rule:#bbb;--mark:#1d6a96;--warn:#6b3a05;--warn-page:#fff}
body{font-size:10.5pt;-webkit-print-color-adjust:exact;print-color-adjust:exact}
main,header,footer{max-width:none;padding-left:0;padding-right:0}header{padding-top:0}
.plots{grid-template-columns:1fr 1fr;gap:4mm}.figures{grid-template-columns:repeat(4,1fr);gap:3mm}.figures dd{font-size:13pt}
.scroll{overflow:visible}h2{break-after:avoid}tr,.figures>div,.caution{break-inside:avoid}thead{display:table-header-group}figure.wide svg{max-height:120mm}}
`.trim();
