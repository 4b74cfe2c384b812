import { createHash } from 'node:crypto';

/** One sheet for screen and paper: ink on paper, colour only for what needs attention. */
export const STYLE = `
:root{--ink:#1c1f21;--soft:#565d62;--rule:#c9cccc;--urgent:#a8201a;--care:#7d5200}
*{box-sizing:border-box}
html{font:14px/1.45 system-ui,"Segoe UI","DejaVu Sans",sans-serif;color:var(--ink);background:#fff;font-variant-numeric:tabular-nums}
body{max-width:52rem;margin:0 auto;padding:1.5rem 1rem 3rem}
h1{font-size:1.7rem;line-height:1.2;margin:0 0 .2rem}
h2{font-size:1.15rem;margin:2rem 0 .6rem;padding-bottom:.25rem;border-bottom:1.5px solid var(--ink)}
h3{font-size:.95rem;margin:1.1rem 0 .3rem}
p{margin:.35rem 0}
.soft,caption,figcaption{color:var(--soft)}
.figures{display:grid;grid-template-columns:repeat(auto-fit,minmax(9.5rem,1fr));gap:.6rem 1.2rem;margin:1rem 0}
.figures div{border-top:1px solid var(--rule);padding-top:.3rem}
.figures b{display:block;font-size:1.35rem;line-height:1.25}
.finding{border-left:3px solid var(--rule);padding:.1rem 0 .1rem .8rem;margin:.9rem 0;break-inside:avoid}
.finding.act{border-color:var(--urgent)}
.finding.watch{border-color:var(--care)}
.finding h3{margin:0}
.finding .level{font-weight:400}
.finding.act .level{color:var(--urgent);font-weight:600}
.finding.watch .level{color:var(--care);font-weight:600}
.finding ul{margin:.3rem 0;padding-left:1.1rem}
figure{margin:.6rem 0 1rem;break-inside:avoid}
figcaption{font-size:.85rem}
svg{display:block;width:100%;height:auto;font-size:10.5px}
svg .grid{stroke:#e4e6e6}
svg .axis{stroke:var(--ink)}
svg .line{fill:none;stroke:var(--ink);stroke-width:1.4}
svg .thin{fill:none;stroke:var(--soft);stroke-width:.7}
svg .bar{stroke:var(--soft);stroke-width:.8}
svg .mark{fill:var(--ink)}
svg .hollow{fill:#fff;stroke:var(--urgent);stroke-width:1.2}
svg .limit{stroke:var(--urgent);stroke-dasharray:4 3}
svg .tick{fill:var(--soft)}
svg .label{fill:var(--ink)}
table{border-collapse:collapse;width:100%;font-size:.82rem;margin:.4rem 0}
th,td{text-align:left;padding:.22rem .5rem .22rem 0;border-bottom:1px solid var(--rule);vertical-align:top}
th{font-weight:600;border-bottom:1px solid var(--ink)}
td.n,th.n{text-align:right;padding-left:.5rem}
td.n{white-space:nowrap}
th{vertical-align:bottom}
tr{break-inside:avoid}
thead{display:table-header-group}
.wide{overflow-x:auto}
.time{white-space:nowrap}
.grids{display:grid;grid-template-columns:repeat(auto-fit,minmax(18rem,1fr));gap:0 2rem}
.bad{color:var(--urgent);font-weight:600}
.caution{border:1.5px solid var(--ink);padding:.6rem .9rem;margin:2rem 0 0;break-inside:avoid}
.empty{color:var(--soft);font-style:italic}
@page{size:A4;margin:16mm 14mm 18mm}
@media print{html{font-size:10.2pt}body{max-width:none;padding:0}h2{break-after:avoid}h3{break-after:avoid}.wide{overflow:visible}table{font-size:8pt}th,td{padding-right:.3rem}td.n,th.n{padding-left:.35rem}.page{break-before:page}}
`.trim();

/** By which a browser's policy lets this one sheet through and no other. */
export const STYLE_HASH = `sha256-${createHash('sha256').update(STYLE).digest('base64')}`;
