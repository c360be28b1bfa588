"""The one style sheet of the HTML cards: a page a site on A4, one column on a phone."""

from __future__ import annotations

from typing import Final

CSS: Final = """
:root{color-scheme:light}
*{box-sizing:border-box}
html{font-size:16px}
body{margin:0 auto;max-width:54rem;padding:0 .8rem;font:1rem/1.4 system-ui,"DejaVu Sans",sans-serif;
  color:#111;background:#fff}
bdi{overflow-wrap:anywhere}
h1,h2,h3,p,ol,ul,dl,dd,figure,table{margin:0}
h2{font-size:1.25rem;line-height:1.2;max-height:4.8em;overflow:auto}
h3{font-size:.82rem;text-transform:uppercase;letter-spacing:.04em;color:#333;margin:.7rem 0 .2rem}
.front{padding:1rem 0}
.front ol{list-style:none;padding:0;max-height:50vh;overflow:auto}
.front li{padding:.2rem 0}
.front a{display:inline-block;min-height:44px;line-height:44px;color:#0b4f8a;max-width:100%;
  max-height:132px;overflow:auto}
.shared{position:absolute}
article,.others{border-top:3px solid #111;padding:.8rem 0 1.6rem}
article>header{display:flex;gap:1rem;justify-content:space-between}
.who{min-width:0}
.action{display:inline-block;text-transform:uppercase;border:2px solid #111;border-radius:.3rem;
  padding:0 .5rem;margin:.3rem 0;font-weight:700}
.visit{font-weight:700}
.square{flex:none;width:7rem}
.square svg{display:block;width:100%}
.facts{display:grid;grid-template-columns:1fr 1fr;gap:0 1.2rem}
dl{display:grid;grid-template-columns:max-content 1fr;gap:.1rem .6rem}
dt{color:#444}
dd{max-height:6em;overflow:auto}
.do ol{padding-left:1.5em}
.do li{margin:.15rem 0}
.do data,.signals data{font-weight:700;white-space:nowrap}
.dials{display:grid;grid-template-columns:1fr 1fr;gap:.6rem;margin-top:.5rem}
figure{text-align:center}
figure svg{width:100%;max-width:20rem}
figcaption{font-size:.85rem}
table{border-collapse:collapse;width:100%}
caption{text-align:left}
th,td{border-bottom:1px solid #bbb;padding:.15rem .4rem;text-align:left;vertical-align:top}
td data{font-variant-numeric:tabular-nums}
.bad th,.bad td{color:#8f1d14;border-left:0}
.dials p{grid-column:1/-1;text-align:center;font-size:.85rem}
.others ul{list-style:none;padding:0;columns:15rem;column-gap:1.2rem;font-size:.85rem}
.others li{display:flex;justify-content:space-between;gap:.5rem;border-bottom:1px solid #ccc;
  break-inside:avoid;max-height:5em;overflow:auto}
.signals tbody th{font-weight:400;width:44%}
.signals tbody .bad th{font-weight:700}
.bad th::before{content:"\\2717  "}
.note{font-size:.9rem;margin-top:.3rem}
.back ul{list-style:none;padding:0;display:grid;grid-template-columns:1fr 1fr;gap:.9rem 1.2rem}
.back li{border-bottom:1px solid #555;padding-top:.2rem;min-height:2.1rem;color:#333;font-size:.85rem}
.care ul{padding-left:1.2em;font-size:.9rem}
footer{margin-top:.6rem;font-size:.75rem;color:#444;max-height:4em;overflow:auto}
text{text-anchor:middle;dominant-baseline:central;font-family:inherit}
text.tick{fill:#444}
text.target{fill:#000;font-weight:700}
text.wrong{fill:#8f1d14;font-weight:700}
text.stop{fill:#222}
polyline{fill:none;stroke:#222}
polyline.ring{stroke-width:1.5}
polyline.tick{stroke-width:1}
polyline.plumb{stroke:#999;stroke-width:.8;stroke-dasharray:2 4}
polyline.present{stroke-width:3;stroke-dasharray:7 5}
polyline.target{stroke-width:5;stroke:#000}
polyline.turn{stroke-width:3.5;stroke:#0b4f8a}
polyline.wrong{stroke:#b3261e;stroke-width:1.2}
polygon.target{fill:#000}
polygon.turn{fill:#0b4f8a}
polygon.tolerance{fill:#1b7f3b}
polygon.wrong{fill:#fbe3e0}
polygon.stop{fill:#8a8a8a}
@media (max-width:560px){
.signals tbody th{width:36%}
.facts,.dials,.back ul{grid-template-columns:1fr}
.square{width:5.5rem}
}
@media print{
@page{size:A4;margin:11mm 12mm}
html{font-size:8.3pt}
body{line-height:1.25;max-width:none;padding:0}
article{position:relative;border:0;padding:0;break-after:page;break-inside:avoid;
  height:274mm;overflow:hidden;display:flex;flex-direction:column}
article>*{flex:none}
article>.dials{flex:1 1 0;min-height:30mm;grid-template-rows:minmax(0,1fr) auto}
figure{display:flex;flex-direction:column;min-height:0}
figure svg{flex:1 1 0;min-height:0;max-width:none}
.front{break-after:page}
.front ol{max-height:none;columns:2;column-gap:1.6rem}
.front li{break-inside:avoid;padding:0}
.front a{min-height:0;line-height:1.3}
.facts{grid-template-columns:1fr 1fr}
.dials{grid-template-columns:1fr 1fr;margin:0}
.back ul{grid-template-columns:1fr 1fr;gap:.1rem 1.2rem}
.dials{gap:.1rem .6rem}
.care ul{columns:2;column-gap:1.8rem}
h3{margin:.4rem 0 .1rem}
h2,dd,footer{overflow:hidden}
h2{max-height:2.4em}
dd{max-height:3.8em}
footer{max-height:2.6em}
.square{position:absolute;top:0;right:0;width:25mm}
.who,.facts{padding-right:27mm}
.others{border:0;padding:0}
}
"""
