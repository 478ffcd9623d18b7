"use strict";
// Shared by the page's scripts: the data, small makers of elements, and words. User text goes into textContent only.
const page = (() => {
  const data = JSON.parse(document.getElementById("data").textContent);
  const plots = data.plots;
  const count = plots.plot.length;
  for (const one of data.questions) one.views = one.views.filter((view) => view.picture); // some may be left out
  // of many plots the page holds readings and marks of the leading ones only
  for (const values of [...data.readings.map((reading) => reading.values), ...Object.values(data.marks)]) while (values.length < count) values.push(null);
  const ranked = [], aside = [];
  for (let i = 0; i < count; i++) (plots.rank[i] === null ? aside : ranked).push(i);

  function make(tag, attributes, ...children) {
    const made = document.createElement(tag);
    for (const [name, value] of Object.entries(attributes || {})) {
      if (name === "onclick") made.addEventListener("click", value);
      else if (value !== null && value !== undefined && value !== false) made.setAttribute(name, value === true ? "" : value);
    }
    made.append(...children.filter((child) => child !== null && child !== undefined));
    return made;
  }
  function draw(tag, attributes, ...children) {
    const made = document.createElementNS("http://www.w3.org/2000/svg", tag);
    for (const [name, value] of Object.entries(attributes || {})) made.setAttribute(name, value);
    made.append(...children);
    return made;
  }
  function classOf(mark) {
    return mark === null ? null : data.edges.filter((edge) => mark >= edge).length;
  }
  // a plot's sign in legend and shelf, as on the map
  function sign(kind) {
    const svg = draw("svg", { width: 15, height: 15, viewBox: "0 0 15 15", "aria-hidden": "true" });
    if (kind === "aside") {
      svg.append(draw("path", { d: "M2 9 L9 2 M2 13.4 L13.4 2 M6.5 13 L13 6.5", stroke: "#2b2a27", "stroke-width": 0.8 }));
      svg.append(draw("rect", { x: 2, y: 2, width: 11, height: 11, fill: "none", stroke: "#2b2a27", "stroke-width": 1.3, "stroke-dasharray": "2.4 1.8" }));
    } else if (kind === "bare") {
      svg.append(draw("rect", { x: 2, y: 2, width: 11, height: 11, fill: "#ece6d9", stroke: "#cfc7b6", "stroke-width": 1 }));
    } else if (kind === "unasked") {
      svg.append(draw("rect", { x: 2, y: 2, width: 11, height: 11, fill: "#faf7f0", stroke: "#2b2a27", "stroke-width": 1.2 }));
    } else if (kind === "unknown") {
      svg.append(draw("rect", { x: 2, y: 2, width: 11, height: 11, fill: "#faf7f0", stroke: "#2b2a27", "stroke-width": 1.2 }));
      svg.append(draw("circle", { cx: 7.5, cy: 7.5, r: 1.4, fill: "#2b2a27" }));
    } else {
      svg.append(draw("rect", { x: 2, y: 2, width: 11, height: 11, fill: data.ramp[kind], stroke: "#2b2a27", "stroke-width": 1.2 }));
    }
    return svg;
  }
  // a hairline 0–100 with a tick at the mark, and a bracket from its lowest to its highest
  function ruler(mark, low, high, width, height) {
    const svg = draw("svg", { viewBox: `0 0 ${width} ${height}`, preserveAspectRatio: "none", "aria-hidden": "true" });
    const at = (value) => 1 + (value / 100) * (width - 2);
    const middle = height / 2;
    const line = (x0, y0, x1, y1, stroke, wide) =>
      svg.append(draw("line", { x1: x0, y1: y0, x2: x1, y2: y1, stroke, "stroke-width": wide, "vector-effect": "non-scaling-stroke" }));
    line(at(0), middle, at(100), middle, "#cfc7b6", 1);
    for (const edge of [0, 20, 40, 60, 80, 100]) line(at(edge), middle - 2, at(edge), middle + 2, "#cfc7b6", 1);
    if (low !== null && high !== null && high - low > 0.05) line(at(low), middle, at(high), middle, "#2b2a27", 1.4);
    if (mark !== null) line(at(mark), 1, at(mark), height - 1, "#2b2a27", 2.6);
    return svg;
  }
  function ordinal(n) {
    const tens = n % 100;
    return n + (tens > 10 && tens < 14 ? "th" : ["th", "st", "nd", "rd"][n % 10] || "th");
  }
  // text that runs from right to left, or turns what stands around it, is kept to itself
  function isolated(text) {
    return /[\u0590-\u08ff\u200f\u202a-\u202e\u2066-\u2069\ufb1d-\ufdff\ufe70-\ufefc]/.test(text) ? `\u2068${text}\u2069` : text;
  }
  function called(i) {
    return plots.name[i] === null ? `Plot ${isolated(plots.plot[i])}` : `${isolated(plots.name[i])} (plot ${isolated(plots.plot[i])})`;
  }
  function zoneTitle(i) {
    const zone = data.zones[plots.zone[i]];
    return zone ? zone.title : plots.zone[i] || "";
  }
  const SHORT = { "°": "°", "° from true north": "°", "× open ground": " ×" };
  function shown(column, value) {
    if (value === null) return "unknown";
    if (typeof value === "string") return value;
    if (column.name === "breeze_arrival_h") return clock(value);
    if (column.unit === "0–1") return `${(100 * value).toFixed(column.decimals > 2 ? 1 : 0)} %`;
    const number = value.toFixed(column.decimals).replace("-", "−");
    const unit = SHORT[column.unit];
    return number + (unit === undefined ? (column.unit ? ` ${column.unit}` : "") : unit);
  }
  // an hour of the day to ten minutes: 10.3 is about 10:20
  function clock(hours) {
    const tens = Math.round(hours * 6);
    return `about ${Math.floor(tens / 6)}:${tens % 6}0`;
  }
  // a mark as people read it, with the lower one that ranks go by where it differs by 1 or more
  function markWords(i) {
    const mark = page.now.mark[i], low = page.now.low[i];
    if (mark === null) return "unknown";
    const atWorst = low !== null && Math.round(10 * mark) - Math.round(10 * low) >= 10;
    return whole(mark) + (atWorst ? ` (at worst ${whole(low)})` : "");
  }
  const whole = (mark) => String(Math.floor(mark + 0.5));
  const quietIfEmpty = new Set(["zone_2_share", "mark_in_zone", "mark_in_zone_2", "best_patch_lon", "best_patch_lat"]);
  // one reading of a plot in words; null where it does not come up
  function readingWords(reading, i) {
    const value = reading.values[i];
    if (reading.name === "breeze_screen" && plots.above_breeze[i]) return `${shown(reading, value)}: the plot itself lies above the breeze`;
    if (value === null && quietIfEmpty.has(reading.name)) return null;
    if (!reading.name.startsWith("crest_")) return reading.kind === "text" && value === null ? null : shown(reading, value);
    const screen = data.readings.find((one) => one.name === "breeze_screen"), share = screen ? screen.values[i] : null;
    if (share === null || share < 0.005 || (value === null && plots.above_breeze[i])) return null;
    if (value === null) return reading.name === "crest_bearing_deg" ? "none" : null;
    return shown(reading, value);
  }
  // now: ranks and marks as the questions are weighed at the moment (weigh.js)
  const state = { chosen: null, question: "overall", view: 0 };
  const watchers = [];
  // which picture of a question shows the ground as the chosen plot's zone judges it
  function ownView() {
    const one = question(), zone = state.chosen === null ? null : plots.zone[state.chosen];
    return one ? Math.max(0, one.views.findIndex((view) => view.zones.includes(zone))) : 0;
  }
  function change(what) {
    Object.assign(state, what);
    if (!("view" in what)) {
      const view = ownView();
      if (view !== state.view) { state.view = view; what.view = view; }
    }
    for (const watch of watchers) watch(what);
  }
  function question() {
    return data.questions.find((one) => one.name === state.question) || null;
  }
  // whether a plot's zone asks the chosen question at all
  function asks(i) {
    const one = question();
    return !one || one.asked_by.includes(plots.zone[i]);
  }
  // the marks that the map and its legend speak of at the moment
  function marks() {
    const one = question();
    return one ? one.marks : page.now.mark;
  }
  return { data, plots, count, ranked, aside, make, draw, classOf, sign, ruler, ordinal, called, zoneTitle, shown, state, watchers,
    change, question, marks, asks, markWords, readingWords };
})();
