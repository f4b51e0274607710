"""The style sheet of the HTML page: light, dark and print from one set of colours."""

STYLE = """
:root { color-scheme: light dark;
  --paper: #fbfaf7; --card: #ffffff; --ink: #1d2430; --soft: #5b6573; --line: #d9d6cd;
  --damage: #b3261e; --malfunction: #8a2f8f; --marginal: #8a5a00; --unknown: #1f5f8b; --sound: #2c6e3f;
  --bar: #1d2430; --zone-low: #cfe3d4; --zone-high: #cfe3d4; --zone-between: #f3e3b8; --zone-over: #f2c6c1; }
@media (prefers-color-scheme: dark) { :root {
  --paper: #14171c; --card: #1c2128; --ink: #e4e7ec; --soft: #9aa4b2; --line: #333b46;
  --damage: #ff8a80; --malfunction: #e29cf0; --marginal: #f2c14e; --unknown: #7cc4f2; --sound: #86d29a;
  --bar: #e4e7ec; --zone-low: #23452e; --zone-high: #23452e; --zone-between: #4a3d15; --zone-over: #5c2420; } }
* { box-sizing: border-box; }
body { margin: 0 auto; max-width: 62rem; padding: 1.5rem 1.25rem 4rem; background: var(--paper); color: var(--ink);
  font: 1rem/1.5 system-ui, sans-serif; overflow-wrap: anywhere; }
h1 { font-size: 1.35rem; margin: 2.5rem 0 .25rem; } h1:first-of-type { margin-top: 0; }
h2 { font-size: 1.1rem; margin: 2.2rem 0 .5rem; border-bottom: 1px solid var(--line); padding-bottom: .25rem; }
h2 small { font-weight: normal; color: var(--soft); }
h3 { font-size: 1rem; margin: 0 0 .4rem; }
p { margin: .35rem 0; } .soft { color: var(--soft); }
code, .place { font-family: ui-monospace, monospace; font-size: .92em; }
.counts { display: flex; flex-wrap: wrap; gap: .6rem; margin: 1rem 0; padding: 0; list-style: none; }
.counts li { background: var(--card); border: 1px solid var(--line); border-radius: .5rem; padding: .4rem .9rem;
  min-width: 6.5rem; }
.counts b { display: block; font-size: 1.5rem; line-height: 1.2; }
.finding { background: var(--card); border: 1px solid var(--line); border-left-width: .35rem; border-radius: .4rem;
  padding: .8rem 1rem; margin: .8rem 0; }
.finding.damage { border-left-color: var(--damage); } .finding.malfunction { border-left-color: var(--malfunction); }
.finding.marginal { border-left-color: var(--marginal); } .finding.unknown { border-left-color: var(--unknown); }
.damage > b, .word.damage { color: var(--damage); } .malfunction > b, .word.malfunction { color: var(--malfunction); }
.marginal > b, .word.marginal { color: var(--marginal); } .unknown > b, .word.unknown { color: var(--unknown); }
.sound > b, .word.sound { color: var(--sound); } .word { font-weight: 600; }
dl { display: grid; grid-template-columns: 6rem 1fr; gap: .15rem .8rem; margin: .5rem 0 0; }
dt { color: var(--soft); } dd { margin: 0; }
a { color: inherit; }
figure { margin: .8rem 0 0; overflow-x: auto; } figcaption { color: var(--soft); font-size: .88em; }
svg { display: block; width: 100%; min-width: 36rem; height: auto; max-width: 50rem; }
svg text { font: 12px system-ui, sans-serif; fill: var(--ink); } svg .quiet { fill: var(--soft); }
svg .bar { fill: var(--bar); } svg .bar.over { fill: var(--damage); } svg .axis { stroke: var(--line); }
svg .limit { stroke: var(--ink); stroke-dasharray: 3 2; }
svg .zone-low { fill: var(--zone-low); } svg .zone-high { fill: var(--zone-high); }
svg .zone-between { fill: var(--zone-between); } svg .zone-over { fill: var(--zone-over); }
.wide { overflow-x: auto; }
table { border-collapse: collapse; width: 100%; font-size: .93rem; background: var(--card); }
th, td { text-align: left; vertical-align: top; padding: .3rem .6rem; border: 1px solid var(--line); }
th { font-weight: 600; } th, td { overflow-wrap: normal; } td code, td .place { overflow-wrap: anywhere; }
pre { white-space: pre-wrap; background: var(--card); border: 1px solid var(--line); padding: .7rem; border-radius: .4rem; }
details { margin: .4rem 0; } summary { cursor: pointer; }
.notice { margin-top: 2.5rem; border-top: 1px solid var(--line); padding-top: .8rem; color: var(--soft); }
@media (max-width: 38rem) { dl { grid-template-columns: 1fr; } dd { margin-bottom: .4rem; } }
@media print { body { max-width: none; padding: 0; font-size: 10pt; background: none; }
  .finding, figure, tr { break-inside: avoid; } h2 { break-after: avoid; } svg { max-width: 15cm; min-width: 0; }
  * { print-color-adjust: exact; } }
"""
