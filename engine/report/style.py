"""How the HTML report looks: dark on white, one column, and the same on paper."""

STYLE = """
:root { color-scheme: light; }
body { margin: 0; background: #fff; color: #16181d;
  font: 15px/1.5 Georgia, "Times New Roman", serif; }
main { max-width: 800px; margin: 0 auto; padding: 28px 20px 60px; }
h1 { font-size: 25px; line-height: 1.2; margin: 0 0 4px; letter-spacing: .2px; }
h2 { font-size: 16px; margin: 34px 0 6px; padding-bottom: 3px; border-bottom: 1px solid #c9ccd3; }
p { margin: 4px 0; }
figure { margin: 14px 0 10px; }
figcaption { font-size: 13px; color: #50545e; margin-top: 2px; }
svg { width: 100%; height: auto; display: block; }
table { border-collapse: collapse; margin: 10px 0;
  font: 13px/1.35 "DejaVu Sans", Verdana, sans-serif;
  font-variant-numeric: tabular-nums; width: 100%; }
th { text-align: left; font-weight: 600; color: #50545e; border-bottom: 1px solid #8b909c; }
th, td { padding: 3px 10px 3px 0; vertical-align: top; }
td { border-bottom: 1px solid #eceef1; }
th.n, td.n { text-align: right; }
th:last-child, td:last-child { padding-right: 0; }
.short table { width: auto; }
.short td.n, .short th.n { padding-left: 26px; }
.time tbody tr:last-child td { border-top: 1px solid #8b909c; border-bottom: 0; font-weight: 600; }
.time td:last-child { color: #50545e; }
td.n + td:not(.n), th.n + th:not(.n) { padding-left: 16px; }
.conditions table, .lost table, .refused table { width: auto; min-width: 55%; }
.conditions td.n, .conditions th.n { padding-left: 26px; }
.time td:first-child { white-space: pre; }
details { margin-top: 8px; } summary { cursor: pointer; color: #50545e; }
svg text { font: 10.5px "DejaVu Sans", Verdana, sans-serif; fill: #3a3e47; }
svg .label { fill: #50545e; }
.frame { fill: none; stroke: #8b909c; stroke-width: .8; }
.grid { stroke: #dfe2e7; stroke-width: .6; }
.day { fill: #d5d8de; } .civil { fill: #e0e3e8; }
.nautical { fill: #eaecf0; } .astronomical { fill: #f4f5f7; }
.lost { fill: #d9b48a; fill-opacity: .45; stroke: #8a5a1e; stroke-width: .6;
  stroke-dasharray: 2 2; }
.f0 { fill: #2f5fa8; stroke: #2f5fa8; } .f1 { fill: #2e8b57; stroke: #2e8b57; }
.f2 { fill: #c0392b; stroke: #c0392b; } .f3 { fill: #6b4a3a; stroke: #6b4a3a; }
.f4 { fill: #8e44ad; stroke: #8e44ad; } .f5 { fill: #16181d; stroke: #16181d; }
rect.f0, rect.f1, rect.f2, rect.f3, rect.f4, rect.f5 { stroke-width: .5; }
svg .on { font-size: 8.5px; fill: #fff; }
.mark { stroke-width: 1.1; fill-opacity: .55; }
.mark.hollow, rect.hollow { fill: #fff; }
.mark.ring { fill: none; stroke: #16181d; stroke-width: .9; }
.moon { fill: none; stroke: #6f7480; stroke-width: 1.3; stroke-dasharray: 5 4; }
.foreseen { fill: none; stroke: #16181d; stroke-width: 1.2; }
.band { fill: #b9c3d6; fill-opacity: .55; }
@page { size: A4; margin: 15mm 14mm; }
@media print {
  body { font-size: 10.5pt; } main { max-width: none; padding: 0; }
  h2 { margin-top: 16pt; break-after: avoid; } section > p { break-after: avoid; }
  figure, tr { break-inside: avoid; }
  table { font-size: 8pt; } thead { display: table-header-group; }
  details:not([open]) > table { display: none; } summary { display: none; }
  .every:not(:has(details[open])) { display: none; }
  * { -webkit-print-color-adjust: exact; print-color-adjust: exact; }
}
"""
