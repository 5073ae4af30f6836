"""How the page looks on a screen and on paper."""

STYLE = """
:root { --ink: #22303a; --soft: #6b7780; --line: #d9d5cc; --paper: #fbfaf6; --accent: #b5651d; --tint: #f3eee3; }
* { box-sizing: border-box; }
body { margin: 0; background: var(--paper); color: var(--ink);
  font: 13px/1.45 "Helvetica Neue", "DejaVu Sans", Arial, sans-serif; }
main { max-width: 1160px; margin: 0 auto; padding: 26px 24px 30px; }
.columns { display: grid; grid-template-columns: minmax(0, 1.2fr) minmax(0, 1fr); gap: 0 32px; }
.column { max-width: 760px; }
header { border-left: 5px solid var(--accent); padding-left: 16px; margin-bottom: 20px; }
h1 { font: 600 27px/1.2 Georgia, "DejaVu Serif", serif; margin: 2px 0 6px; letter-spacing: -.01em; }
h2 { font: 600 15px/1.3 Georgia, "DejaVu Serif", serif; margin: 0 0 7px; color: var(--accent); }
.of { margin: 0; color: var(--soft); font-size: 11.5px; }
.lead { margin: 0; font-size: 14px; max-width: 62em; }
section { margin: 0 0 20px; break-inside: avoid; }
table { border-collapse: collapse; width: 100%; font-variant-numeric: tabular-nums; }
th, td { text-align: left; vertical-align: top; padding: 3.5px 8px 3.5px 0; border-bottom: 1px solid var(--line); }
thead th { font-weight: 600; color: var(--soft); font-size: 11.5px; border-bottom: 1.5px solid var(--ink); }
tbody th { font-weight: 400; white-space: nowrap; }
tbody th b { font-weight: 600; }
small { display: block; color: var(--soft); font-size: 10.5px; line-height: 1.35; font-weight: 400; }
sup { font-size: .72em; line-height: 0; }
.matrix td, .plain td { white-space: nowrap; }
.matrix td strong { font-size: 14px; margin-right: 6px; }
.matrix thead th:first-child, .plain thead th:first-child { width: 6.5em; }
.roads td { white-space: nowrap; }
.roads td:nth-child(3) { white-space: normal; width: 30%; }
.roads td:nth-child(3) { background: var(--tint); padding-left: 10px; }
.under { margin: 6px 0 0; color: var(--soft); font-size: 11px; }
svg { width: 100%; height: auto; display: block; }
svg text { font: 9.5px "Helvetica Neue", "DejaVu Sans", Arial, sans-serif; fill: var(--ink); }
svg .tick, svg .mark { fill: var(--soft); font-size: 8.5px; }
svg .title { font-weight: 600; }
svg .middle { text-anchor: middle; }
svg .end { text-anchor: end; }
svg .curve { fill: none; stroke-width: 1.4; stroke-linejoin: round; }
svg .axis { fill: none; stroke: var(--ink); stroke-width: .7; }
svg .guide { stroke: var(--soft); stroke-width: .7; stroke-dasharray: 1 3; }
.assumed ul { margin: 0; padding-left: 16px; font-size: 11.5px; }
.caution { border-left: 3px solid var(--accent); background: var(--tint); margin: 8px 0 0; padding: 6px 10px; }
footer { color: var(--soft); }
footer ul { margin: 0; columns: 4 220px; column-gap: 24px; list-style: none; padding: 0; font-size: 10px; }
code { font-family: "DejaVu Sans Mono", Menlo, monospace; font-size: .95em; }
@media (max-width: 900px) { .columns { display: block; } }
@media (max-width: 560px) {
  main { padding: 16px 12px; }
  table { display: block; overflow-x: auto; }
}
@page { size: A4; margin: 10mm; }
@media print {
  body { background: white; }
  main { max-width: none; padding: 0; zoom: .62; }
  .columns { display: grid; }
}
"""
