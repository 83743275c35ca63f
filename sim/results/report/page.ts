/**
 * The page around the report: its style and its frame. No script, nothing from outside, one file.
 *
 * Colours are those of every drawing, light and dark by the reader's own setting, always light on paper. Type is the
 * reader's system's: an embedded one would be the largest part of the file.
 */
import { figureStyle, safe } from '../figures/figure.js';
import { networkStyle } from '../figures/network.js';
import { DARK, LIGHT, type Palette } from '../figures/palette.js';
import type { Section } from './findings.js';

function tokens(palette: Palette): string {
  const { groups: _groups, ramp: _ramp, ...plain } = palette;
  return Object.entries(plain)
    .map(([key, value]) => `--${key.replace(/[A-Z]/g, (c) => `-${c.toLowerCase()}`)}:${value}`)
    .join(';');
}

const FAMILY = "system-ui,-apple-system,'Segoe UI',Roboto,'Noto Sans','Liberation Sans',Arial,sans-serif";

function style(): string {
  const named = {
    ink: 'var(--ink)',
    panel: 'var(--panel)',
    satisfied: 'var(--satisfied)',
    frustrated: 'var(--frustrated)',
  };
  return `
:root{color-scheme:light dark;${tokens(LIGHT)}}
@media screen and (prefers-color-scheme:dark){:root{${tokens(DARK)}}}
*{box-sizing:border-box}
html{-webkit-text-size-adjust:100%}
body{margin:0;background:var(--paper);color:var(--ink);font:16px/1.55 ${FAMILY};font-variant-numeric:tabular-nums}
main,header,footer{max-width:58rem;margin:0 auto;padding:0 1.25rem}
header{padding-top:2.75rem}
h1{font-size:1.9rem;line-height:1.2;margin:.2rem 0 1.1rem;font-weight:650;letter-spacing:-.01em}
h2{font-size:1.3rem;line-height:1.3;margin:3rem 0 .7rem;padding-top:1rem;border-top:1px solid var(--line);font-weight:650}
h3{font-size:1.03rem;margin:1.7rem 0 .45rem;font-weight:650}
p,ul,ol,dl{max-width:42rem;margin:.55rem 0}
li{margin:.25rem 0}
a{color:var(--satisfied);text-underline-offset:.15em}
.kicker,.note,figcaption,.setting{color:var(--soft)}
.kicker{margin:0;font-size:.9rem}
.note,figcaption{font-size:.86rem;line-height:1.45}
.question{font-size:1.12rem;margin:.3rem 0;color:var(--soft)}
.answer{font-size:1.36rem;line-height:1.42;margin:.5rem 0 1rem;max-width:46rem;font-weight:500}
.caution{border-left:3px solid var(--frustrated);padding:.1rem 0 .1rem .9rem;margin:1.1rem 0;font-size:.93rem}
.caution p{margin:.3rem 0}
nav ul{list-style:none;padding:0;margin:1.3rem 0 0;max-width:none;display:flex;flex-wrap:wrap;gap:.2rem 1.1rem;font-size:.9rem}
nav li{margin:0}
dt{font-weight:650;margin-top:.7rem}
dd{margin:.1rem 0 0;overflow-wrap:anywhere}
code{font-family:ui-monospace,SFMono-Regular,Menlo,Consolas,'DejaVu Sans Mono',monospace;font-size:.88em;overflow-wrap:anywhere}
pre{background:var(--panel);border:1px solid var(--line);border-radius:4px;padding:.7rem .9rem;overflow-x:auto;max-width:42rem;white-space:pre-wrap}
.plates{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(100%,22rem),1fr));gap:1.5rem 2.2rem;margin:1.2rem 0;align-items:start}
.plates>figure{max-width:29rem}
.plates.three{grid-template-columns:repeat(auto-fit,minmax(min(100%,15rem),1fr));gap:1.5rem 1.2rem}
.plates.three>figure{max-width:19rem}
.plates.maps{grid-template-columns:repeat(3,1fr);gap:.9rem}
.plates.maps figcaption{margin-top:.2rem}
figure{margin:0}
figcaption{margin-top:.45rem}
.figure{display:block;width:100%;height:auto}
.hidden{position:absolute}
.field h3{margin-bottom:.3rem}
.field .plates{margin:.3rem 0}
.beside{display:grid;grid-template-columns:1fr;gap:.4rem 2rem;align-items:start}
.beside figure{max-width:27rem}
.beside>div,.beside>figure{min-width:0}
.beside table{font-size:.82rem}
.beside th,.beside td{padding:.26rem .5rem}
.beside th:first-child,.beside td:first-child{padding-left:0}
.beside tbody th{min-width:7rem}
.beside .scroll{margin-top:0}
@media (min-width:58rem){.beside{grid-template-columns:21rem 1fr}}
.scroll{overflow-x:auto;margin:1.1rem 0;max-width:100%}
.scroll:focus-visible,a:focus-visible{outline:2px solid var(--satisfied);outline-offset:2px}
table{border-collapse:collapse;font-size:.88rem;line-height:1.35}
caption{text-align:left;color:var(--soft);padding-bottom:.4rem}
th,td{padding:.28rem .75rem;text-align:right;vertical-align:top;font-weight:400}
th:first-child,td:first-child{padding-left:0}
.w,tbody th{text-align:left}
td{white-space:nowrap}
.w{white-space:normal}
tbody th{min-width:9rem;max-width:22rem}
thead th{color:var(--soft);border-bottom:1px solid var(--line)}
thead td{border-bottom:1px solid var(--line)}
thead th[scope=colgroup]{text-align:center;color:var(--ink);font-weight:600;border-left:1px solid var(--line)}
tbody tr:nth-child(even){background:color-mix(in srgb,var(--faint) 45%,transparent)}
.answers tbody tr:nth-child(even){background:none}
.answers td{min-width:5rem;white-space:normal}
footer{margin-top:3rem;padding-bottom:2.5rem;color:var(--soft);font-size:.86rem}
@media (max-width:36rem){
body{font-size:15.5px}
header{padding-top:1.4rem}
h1{font-size:1.5rem}
.answer{font-size:1.16rem}
.plates.maps{gap:.4rem}
.plates.maps figcaption{font-size:.74rem}
th,td{padding:.28rem .5rem}
tbody th{min-width:7.5rem}
}
@page{size:A4;margin:17mm 16mm 18mm}
@media print{
body{font-size:10pt;line-height:1.42;background:none}
main,header,footer{max-width:none;padding:0}
header{padding-top:0}
nav{display:none}
h1{font-size:20pt}
h2{font-size:14pt;margin-top:1.5rem;break-after:avoid}
h3{font-size:10.5pt;break-after:avoid}
.answer{font-size:13pt}
p,ul,ol,dl,.answer{max-width:none}
p{orphans:3;widows:3}
figure,tr,.caution,dt,.field{break-inside:avoid}
dt{break-after:avoid}
.plates{grid-template-columns:1fr 1fr;gap:1rem 1.6rem}
.plates.three,.plates.maps{grid-template-columns:1fr 1fr 1fr;gap:1rem}
.beside{grid-template-columns:7.2cm 1fr}
.beside table{font-size:7.8pt}
.beside th,.beside td{padding:.14rem .3rem}
.beside tbody th{min-width:0}
.scroll{overflow:visible}
table{font-size:8.4pt}
th,td{padding:.16rem .45rem}
thead{display:table-header-group}
a{color:inherit;text-decoration:none}
.figure{print-color-adjust:exact;-webkit-print-color-adjust:exact}
}
${figureStyle('page')}${networkStyle(named)}.figure{font-family:inherit}
`;
}

/**
 * The whole page.
 *
 * @param head - what stands before the sections: title, question, answer
 */
export function page(o: {
  readonly title: string;
  readonly description: string;
  readonly version: string;
  readonly head: string;
  readonly sections: readonly Section[];
  readonly foot: string;
}): string {
  const nav = o.sections.map(({ id, title }) => `<li><a href="#${id}">${safe(title)}</a></li>`).join('');
  const body = o.sections
    .map(
      ({ id, title, html }) =>
        `<section aria-labelledby="${id}"><h2 id="${id}">${safe(title)}</h2>\n${html}\n</section>`,
    )
    .join('\n');
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width,initial-scale=1">
<meta name="description" content="${safe(o.description)}">
<meta name="generator" content="rungsight ${safe(o.version)}">
<title>${safe(o.title)}</title>
<style>${style()}</style>
</head>
<body>
<header>
${o.head}
<nav aria-label="Contents"><ul>${nav}</ul></nav>
</header>
<main>
${body}
</main>
<footer>${o.foot}</footer>
</body>
</html>
`;
}
