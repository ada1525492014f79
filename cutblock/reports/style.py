"""The look of report.html, on screen and on A4."""

STYLE = """\
:root { color-scheme: light; }
body { font: 15px/1.45 system-ui, Helvetica, Arial, sans-serif; color: #1b1b1b; background: #ffffff;
  max-width: 1080px; margin: 0 auto; padding: 24px; }
h1 { font-size: 28px; margin: 0 0 8px; }
h1 small { color: #505050; font-weight: normal; }
h2 { font-size: 20px; margin: 32px 0 8px; border-bottom: 2px solid #0072B2; padding-bottom: 2px; }
h3 { font-size: 17px; margin: 24px 0 4px; }
header dl { display: flex; flex-wrap: wrap; gap: 8px 28px; margin: 0; }
header dt { color: #505050; font-size: 12px; }
header dd { margin: 0; }
table { border-collapse: collapse; margin: 8px 0; min-width: 40%; }
th, td { text-align: left; padding: 3px 10px 3px 0; border-bottom: 1px solid #dddddd; vertical-align: top; }
thead th { border-bottom: 2px solid #888888; font-size: 13px; }
table.pairs { width: auto; }
table.pairs th { font-weight: normal; color: #505050; padding-right: 24px; white-space: nowrap; }
td.number, th.number { text-align: right; font-variant-numeric: tabular-nums; padding-right: 18px; }
tr.error td:first-child { font-weight: bold; border-left: 6px solid #D55E00; padding-left: 6px; }
tr.warning td:first-child { font-weight: bold; border-left: 6px solid #E69F00; padding-left: 6px; }
tr.info td:first-child { border-left: 6px solid #56B4E9; padding-left: 6px; }
svg { width: 100%; height: auto; display: block; margin: 10px 0; }
summary { cursor: pointer; color: #0072B2; }
@media print {
  body { padding: 0; font-size: 11px; max-width: none; }
  h2, h3 { break-after: avoid; }
  article.block, tr, svg { break-inside: avoid; }
}
"""
