"""The one style sheet of the report: A4 pages in print, one column on a phone."""

from __future__ import annotations

from typing import Final

CSS: Final = """
:root{color-scheme:light}
*{box-sizing:border-box}
body{margin:0 auto;max-width:50rem;padding:0 1rem 2rem;font:1rem/1.45 system-ui,"DejaVu Sans",sans-serif;
  color:#1b1b1f;background:#fff;overflow-wrap:break-word}
h1{font-size:1.6rem;line-height:1.2;margin:1.2rem 0 .3rem}
h2{font-size:1.15rem;margin:1.6rem 0 .4rem;border-bottom:2px solid #1b1b1f}
p{margin:.3rem 0}
.sub{color:#45443f}
.small,li.small{font-size:.85rem}
ul{margin:.3rem 0;padding-left:1.2em}
li{margin:.15rem 0}
.wide{overflow-x:auto}
table{border-collapse:collapse;width:100%;margin:.5rem 0 .8rem;font-size:.88rem}
caption{text-align:left;font-size:.88rem;padding:.2rem 0;color:#1b1b1f}
th,td{text-align:left;vertical-align:top;padding:.16rem .5rem .16rem 0;border-bottom:1px solid #c9c7c0}
thead th{border-bottom:1.5px solid #1b1b1f}
tbody td:first-child{min-width:9ch}
.r{text-align:right;font-variant-numeric:tabular-nums}
.row{display:flex;flex-wrap:wrap;gap:4mm;align-items:flex-start}
figure{margin:.6rem 0;flex:1 1 18rem;min-width:0}
figure.full{flex-basis:100%}
figure img{display:block;width:100%;height:auto}
figcaption{font-size:.85rem;margin-top:.3rem}
footer{margin-top:1.5rem;padding-top:.4rem;border-top:1px solid #c9c7c0;font-size:.8rem;color:#45443f}
@page{size:A4;margin:14mm 15mm}
@media print{
  html{font-size:8.4pt}
  body{max-width:none;padding:0}
  h2,caption,figcaption{break-after:avoid}
  h1{font-size:15pt;margin-top:0}
  h2{font-size:11pt;margin-top:7pt}
  table{margin:2pt 0 4pt}
  th,td{padding:.8pt 6pt .8pt 0}
  .row{gap:3mm}
  figure{margin:2pt 0}
  .page{break-before:page;margin-top:0}
  figure,tr{break-inside:avoid}
  thead,tbody tr:first-child{break-before:avoid;break-after:avoid}
  figure{flex:0 0 auto}
  .wide{overflow:visible}
}
"""
