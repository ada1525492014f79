"""The look of report.html, on screen and on A4."""

STYLE = """\
@page { size: A4; margin: 13mm; }
:root { color-scheme: light; }
* { box-sizing: border-box; }
body { font: 15px/1.45 system-ui, "Segoe UI", Helvetica, Arial, sans-serif; color: #1b1b1b; background: #ffffff;
  max-width: 1080px; margin: 0 auto; padding: 24px; }
header { border: 2px solid #1b1b1b; margin-bottom: 24px; }
header p { margin: 0; padding: 10px 14px 0; color: #505050; font-size: 13px; text-transform: uppercase;
  letter-spacing: 0.06em; }
h1 { font-size: 30px; line-height: 1.2; margin: 0; padding: 0 14px 12px; overflow-wrap: anywhere; }
header dl { display: flex; flex-wrap: wrap; margin: 0; border-top: 1px solid #1b1b1b; overflow: hidden; }
header dl > div { flex: 1 0 auto; min-width: 130px; padding: 6px 14px; margin: 0 -1px -1px 0;
  border-right: 1px solid #c8c8c8; border-bottom: 1px solid #c8c8c8; }
header dt { color: #505050; font-size: 12px; }
header dd { margin: 0; font-weight: 600; overflow-wrap: anywhere; }
h2 { font-size: 20px; margin: 34px 0 10px; border-bottom: 2px solid #0072B2; padding-bottom: 3px; }
h3 { font-size: 18px; margin: 26px 0 2px; }
p { margin: 4px 0 8px; max-width: 78ch; }
p.note { color: #505050; font-size: 13px; }
.cards { display: grid; grid-template-columns: repeat(4, 1fr); gap: 12px; }
.card { border: 1px solid #b8b8b8; border-top: 5px solid #56B4E9; padding: 8px 12px 10px; }
.card.warning { border-top-color: #E69F00; }
.card.error { border-top-color: #D55E00; }
.card span { display: block; color: #505050; font-size: 13px; }
.card b { display: block; font-size: 25px; line-height: 1.25; font-variant-numeric: tabular-nums; }
.card small { display: block; font-size: 12.5px; line-height: 1.35; color: #404040; }
table { border-collapse: collapse; margin: 8px 0; min-width: 40%; }
th, td { text-align: left; padding: 4px 14px 4px 0; border-bottom: 1px solid #dddddd; vertical-align: top; }
thead th { border-bottom: 2px solid #888888; font-size: 13px; vertical-align: bottom; }
table.pairs th { font-weight: normal; color: #505050; padding-right: 28px; }
td.number, th.number { text-align: right; font-variant-numeric: tabular-nums; padding-left: 8px; }
tbody td { white-space: nowrap; }
table.pairs td, tr.finding td { white-space: normal; }
tr.over th { background: #eef2f5; font-size: 13px; padding: 5px 8px; }
tr.sum td { font-weight: bold; border-top: 2px solid #888888; }
tr.finding td:first-child { padding-left: 8px; border-left: 7px solid #56B4E9; }
tr.finding.warning td:first-child { font-weight: bold; border-left-color: #E69F00; }
tr.finding.error td:first-child { font-weight: bold; border-left-color: #D55E00; text-transform: uppercase; }
tr.error td { font-weight: bold; }
tr.finding.error td:not(:first-child) { font-weight: normal; }
.cautions > ul { border: 2px solid #D55E00; padding: 10px 14px 10px 34px; margin: 8px 0; }
svg { width: 100%; height: auto; display: block; margin: 10px 0; }
@media screen and (max-width: 760px) {
  .cards { grid-template-columns: repeat(2, 1fr); }
  table { display: block; overflow-x: auto; }
}
@media print {
  body { padding: 0; font-size: 11px; max-width: none; -webkit-print-color-adjust: exact; print-color-adjust: exact; }
  h1 { font-size: 22px; } h2 { font-size: 15px; margin-top: 20px; } h3 { font-size: 13px; }
  .card b { font-size: 18px; } .card span, .card small, thead th, p.note, tr.over th { font-size: 10px; }
  th, td { padding: 2px 9px 2px 0; }
  table { font-size: 10px; }
  thead { display: table-header-group; }
  h2, h3, p, tr.over { break-after: avoid; }
  article.block { break-before: page; }
  article.block:first-of-type { break-before: auto; }
  tr, svg, .card, .keep, header { break-inside: avoid; }
}
"""
