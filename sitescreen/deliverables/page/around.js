// All round the plot, on one axis of bearings N–E–S–W–N: skyline and sun above, wind, breeze and long axis below.
const around = (() => {
  const { data, plots, make, draw } = page;
  const INK = "#2b2a27", SOFT = "#6a6457", HAIR = "#cfc7b6", PAPER = "#faf7f0";
  const MONTHS = ["January", "February", "March", "April", "May", "June", "July", "August", "September", "October", "November", "December"];
  const POINTS = ["N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE", "S", "SSW", "SW", "WSW", "W", "WNW", "NW", "NNW", "N"];
  const SKY = 168, AXIS = 20, WIND = 86, BREEZE = 19, LONG = 34;
  const ALIKE_PCT = 10; // of what the worst bearing costs: within this the long axis may turn

  const reading = (name, i) => { const one = data.readings.find((each) => each.name === name); return one ? one.values[i] : null; };
  const text = (x, y, words, extra = {}) => draw("text", { x, y, class: "tiny", ...extra }, words);
  const line = (x0, y0, x1, y1, stroke = INK, wide = 1, extra = {}) => draw("line", { x1: x0, y1: y0, x2: x1, y2: y1, stroke, "stroke-width": wide, ...extra });
  const clock = (hours) => { const m = Math.round(hours * 60); return `${Math.floor(m / 60)}:${String(m % 60).padStart(2, "0")}`; };

  function strip(i, room) {
    const one = data.strips.plots[i], siting = (data.siting || [])[i] || null;
    const onshore = reading("onshore_from_deg", i), offshore = reading("offshore_from_deg", i);
    const hasSun = one && one.skyline, hasWind = one && one.winds, hasBreeze = onshore !== null;
    if (!hasSun && !hasWind && !hasBreeze && !siting) return [];
    const svg = draw("svg", { class: "around", role: "img" });
    const width = Math.max(300, room), isNarrow = width < 700, left = isNarrow ? 6 : 104, right = isNarrow ? 8 : 14;
    const at = (bearing) => left + (bearing / 360) * (width - left - right);
    let y = 6;
    const told = [];
    const label = (words, top, note) => {
      if (isNarrow) return;
      svg.append(text(0, top, words, { class: "tiny strong" }));
      if (note) note.forEach((words_, k) => svg.append(text(0, top + 14 * (k + 1), words_)));
    };
    const top = y;
    if (hasSun) {
      drawSky(svg, one, at, y, SKY, isNarrow);
      label("Sun and skyline", y + 12, ["black: the ground", "around; ticks across", "an arc: shaded"]);
      y += SKY;
      told.push(toldSun(one));
    }
    const axis = y;
    for (let k = 0; k <= 16; k++) {
      if (isNarrow && k % 4) continue;
      svg.append(text(at(k * 22.5), y + 14, POINTS[k], { "text-anchor": k === 16 ? "end" : k ? "middle" : "start", class: k % 4 ? "tiny" : "tiny strong" }));
    }
    y += AXIS;
    if (hasWind) {
      drawWind(svg, one.winds, at, y);
      label("Wind from there", y + 12, ["outline: over open", "level ground; filled:", "here"]);
      y += WIND;
      const best = one.winds.indexOf(Math.max(...one.winds.filter((w) => w !== null))), least = one.winds.indexOf(Math.min(...one.winds.filter((w) => w !== null)));
      told.push(`Wind from ${POINTS[best]} is ${one.winds[best].toFixed(2)} times that over open level ground, the most; from ${POINTS[least]} ${one.winds[least].toFixed(2)} times, the least.`);
    }
    if (hasBreeze) {
      band(svg, onshore, at, y, BREEZE, "onshore, by day", INK);
      if (offshore !== null) band(svg, offshore, at, y + BREEZE, BREEZE, "offshore, at night", "none");
      label("Breeze from there", y + 14);
      told.push(`The breeze comes from ${onshore.toFixed(0)}° by day${offshore === null ? "" : ` and from ${offshore.toFixed(0)}° at night`}.`);
      y += 2 * BREEZE + 4;
    }
    if (siting) {
      drawAxis(svg, siting, at, y, LONG);
      label("Long axis", y + 14, ["grey: costs little"]);
      y += LONG;
      told.push(`The long axis that serves sun and wind best lies along ${siting.axis_deg}° and ${siting.axis_deg + 180}°.`);
    }
    for (let k = 0; k <= 16; k += 4) svg.prepend(line(at(k * 22.5), top, at(k * 22.5), y, HAIR, 1));
    svg.prepend(line(left, axis, width - right, axis, INK, 1));
    svg.setAttribute("viewBox", `0 0 ${width} ${y + 4}`);
    svg.setAttribute("width", width);
    svg.setAttribute("height", y + 4);
    svg.setAttribute("aria-label", told.join(" "));
    const clockNote = hasSun ? ` Clock: ${one.clock[0] < 0 ? "−" : "+"}${Math.abs(one.clock[0])} h to universal time${one.clock[1] ? ", assumed from the longitude" : ""}.` : "";
    return [make("h3", { class: "strip-head" }, "All round the plot, by bearing from true north"), svg, make("p", { class: "strip-note" }, (hasSun ? told[0] : "") + clockNote + (siting ? ` Long axis, grey: turning it there costs a tenth of what the worst bearing would, at most.` : ""))];
  }

  // which arcs are drawn strong, with their months and clock times: the two ends of the year and the middle
  function strongMonths(sky) {
    const noon = sky.height.map((heights) => Math.max(0, ...heights) * (1));
    const north = sky.bearing.map((bearings, m) => Math.cos((bearings[sky.height[m].indexOf(Math.max(...sky.height[m]))] || 0) * Math.PI / 1800));
    const lean = noon.map((height, m) => north[m] * (900 - height)); // how far the noon sun stands to the north
    const ends = [lean.indexOf(Math.max(...lean)), lean.indexOf(Math.min(...lean))], middle = (lean[ends[0]] + lean[ends[1]]) / 2;
    const third = lean.map((value, m) => [Math.abs(value - middle), m]).sort((a, b) => a[0] - b[0])[0][1];
    return [...new Set([...ends, third])];
  }

  function drawSky(svg, one, at, y, height, isNarrow) {
    const sky = data.strips.skies[one.sky], floor = y + height, up = (tenths) => floor - (Math.max(0, tenths) / 900) * (height - 8);
    for (const degrees of [30, 60]) {
      svg.append(line(at(0), up(10 * degrees), at(360), up(10 * degrees), HAIR, 0.7, { "stroke-dasharray": "1 4" }), text(at(360) - 2, up(10 * degrees) - 3, `${degrees}°`, { "text-anchor": "end", class: "tiny halo" }));
    }
    const strong = strongMonths(sky);
    const months = [...Array(12).keys()].sort((a, b) => strong.includes(a) - strong.includes(b));
    const words = [];
    for (const m of months) {
      const isStrong = strong.includes(m), runs = [];
      const isLit = (step) => { for (let k = 0; k < one.lit[m].length; k += 2) if (step >= one.lit[m][k] && step < one.lit[m][k] + one.lit[m][k + 1]) return true; return false; };
      sky.height[m].forEach((h, k) => {
        const step = sky.from[m] + k, b = sky.bearing[m][k], lit = isLit(step), last = runs[runs.length - 1];
        const point = [at(b / 10), up(h)];
        if (last && Math.abs(b - last.b) > 1800) { // across north: to one end of the axis and on from the other
          const rises = last.b > b, way = rises ? b + 3600 - last.b : last.b + 3600 - b, t = (rises ? 3600 - last.b : last.b) / way, between = up(last.h + (h - last.h) * t);
          last.points.push([at(rises ? 360 : 0), between]);
          runs.push({ lit, b, h, points: [[at(rises ? 0 : 360), between], point] });
        } else if (!last) runs.push({ lit, b, h, points: [point] });
        else if (last.lit !== lit) runs.push({ lit, b, h, points: [last.points[last.points.length - 1], point] });
        else { last.points.push(point); last.b = b; last.h = h; }
      });
      for (const run of runs) {
        const d = run.points.map(([px, py], k) => `${k ? "L" : "M"}${px.toFixed(1)} ${py.toFixed(1)}`).join("");
        if (!run.lit) svg.append(draw("path", { d, fill: "none", stroke: SOFT, "stroke-width": isStrong ? 7 : 4, "stroke-dasharray": "1 2.6" }));
        svg.append(draw("path", { d, fill: "none", stroke: isStrong ? INK : "#8f8878", "stroke-width": isStrong ? 1.4 : 0.6 }));
      }
      if (!isStrong) continue;
      let highest = 0;
      sky.height[m].forEach((h, k) => { if (h > sky.height[m][highest]) highest = k; });
      for (let hour = 6; hour <= 18; hour += 2) {
        const k = sky.height[m].findIndex((_, n) => sky.hour[sky.from[m] + n] >= hour);
        if (k < 1) continue;
        const h0 = sky.hour[sky.from[m] + k - 1], t = (hour - h0) / (sky.hour[sky.from[m] + k] - h0), b0 = sky.bearing[m][k - 1], b1 = sky.bearing[m][k];
        if (Math.abs(b1 - b0) > 1200) continue;
        const px = at((b0 + (b1 - b0) * t) / 10), py = up(sky.height[m][k - 1] + (sky.height[m][k] - sky.height[m][k - 1]) * t);
        svg.append(draw("circle", { cx: px, cy: py, r: 2.4, fill: PAPER, stroke: INK, "stroke-width": 1.2 }));
        words.push({ x: px, y: py - 6, words: String(hour), order: 1 });
      }
      words.push({ x: at(sky.bearing[m][highest] / 10), y: up(sky.height[m][highest]) - 7, words: isNarrow ? MONTHS[m].slice(0, 3) : MONTHS[m], order: 0, strong: true });
    }
    const ground = one.skyline.map((tenths, k) => `L${at(k * 5).toFixed(1)} ${up(tenths || 0).toFixed(1)}`).join("");
    svg.append(draw("path", { d: `M${at(0)} ${floor}${ground}L${at(360)} ${up(one.skyline[0] || 0).toFixed(1)}L${at(360)} ${floor}Z`, fill: INK }));
    if (one.skyline.some((tenths) => tenths === null)) svg.append(text(at(0) + 4, floor - 4, "? some ground unknown", { class: "tiny on-ink" }));
    // names of months first, then clock times where there is room
    const taken = [30, 60].map((degrees) => [at(360) - 24, up(10 * degrees) - 14, at(360), up(10 * degrees)]);
    for (const word of words.sort((a, b) => a.order - b.order)) {
      const half = word.words.length * 3.4 + 3, x = Math.min(Math.max(word.x, at(0) + half), at(360) - half);
      for (const dy of word.order ? [0, 20] : [0, 16, 32]) {
        const box = [x - half, word.y + dy - 10, x + half, word.y + dy + 2];
        if (box[1] < y - 4 || box[3] > floor - 2 || taken.some((t) => box[2] > t[0] && box[0] < t[2] && box[3] > t[1] && box[1] < t[3])) continue;
        taken.push(box);
        svg.append(text(x, word.y + dy, word.words, { "text-anchor": "middle", class: word.strong ? "tiny strong halo" : "tiny halo" }));
        break;
      }
    }
  }

  function toldSun(one) {
    const known = one.first.map((h, m) => [h, one.last[m], m]).filter(([h]) => h !== null);
    if (!known.length) return "The sun does not reach it over the ground around.";
    const latest = known.reduce((a, b) => (b[0] > a[0] ? b : a)), soonest = known.reduce((a, b) => (b[1] < a[1] ? b : a));
    return `Over the ground around, the sun comes latest in ${MONTHS[latest[2]]}, at ${clock(latest[0])}, and leaves soonest in ${MONTHS[soonest[2]]}, at ${clock(soonest[1])}.`;
  }

  // outlines all as tall as the wind over open level ground; what reaches the plot is filled
  function drawWind(svg, ratios, at, y) {
    const step = 360 / ratios.length, tall = 36; // the most that the method allows, 2.15 times, still fits
    svg.append(line(at(0), y + 4, at(360), y + 4, INK, 1));
    for (let k = 0; k <= ratios.length; k++) {
      const n = k % ratios.length, from = Math.max(0, k * step - 0.38 * step), to = Math.min(360, k * step + 0.38 * step), ratio = ratios[n];
      const wide = at(to) - at(from);
      if (ratio === null) svg.append(text((at(from) + at(to)) / 2, y + 20, "?", { "text-anchor": "middle" }));
      else {
        svg.append(draw("rect", { x: at(from), y: y + 4, width: wide, height: ratio * tall, fill: SOFT }));
        if (k && k < ratios.length && wide > 22) {
          const isInside = ratio > 0.65;
          svg.append(text((at(from) + at(to)) / 2, y + (isInside ? 4 + 0.42 * tall : 16 + ratio * tall), ratio.toFixed(1), { "text-anchor": "middle", class: isInside ? "tiny strong on-ink" : "tiny strong" }));
        }
      }
      svg.append(draw("rect", { x: at(from), y: y + 4, width: wide, height: tall, fill: "none", stroke: INK, "stroke-width": 1 }));
    }
  }

  // a bearing as the sector around it, which may lie across north
  function pieces(bearing, half) {
    const from = bearing - half, to = bearing + half;
    if (from < 0) return [[0, to], [from + 360, 360]];
    return to > 360 ? [[from, 360], [0, to - 360]] : [[from, to]];
  }
  function band(svg, bearing, at, y, height, words, fill) {
    for (const [from, to] of pieces(bearing, 22.5)) {
      svg.append(draw("rect", { x: at(from), y: y + 3, width: at(to) - at(from), height: height - 8, fill: fill === "none" ? PAPER : fill, stroke: INK, "stroke-width": 1 }));
    }
    const isRight = bearing < 270;
    svg.append(text(isRight ? at(Math.min(bearing + 22.5, 360)) + 6 : at(bearing - 22.5) - 6, y + height - 7, `${words}, ${bearing.toFixed(0)}°`, { "text-anchor": isRight ? "start" : "end", class: "tiny halo" }));
  }

  function drawAxis(svg, siting, at, y, room) {
    const height = Math.min(room, 24);
    const costs = siting.cost_pct, step = 180 / costs.length;
    for (const turn of [0, 180]) {
      for (let k = 0; k < costs.length; k++) {
        if (costs[k] > ALIKE_PCT) continue;
        for (const [from, to] of pieces((k * step + turn) % 360, step / 2)) svg.append(draw("rect", { x: at(from), y: y + 7, width: at(to) - at(from) + 0.4, height: height - 14, fill: HAIR }));
      }
      const bearing = siting.axis_deg + turn;
      svg.append(line(at(bearing), y + 2, at(bearing), y + height - 2, INK, 3));
      let end = 0; // of the grey on that side, for the figure to stand beside it
      while (end < 85 && costs[Math.round((siting.axis_deg + end) / step) % costs.length] <= ALIKE_PCT) end += step;
      const where = bearing + end + 2 > 345 ? at(bearing) - 8 : at(bearing + end) + 4;
      svg.append(text(where, y + height - 8, `${bearing}°`, { class: "tiny strong halo", "text-anchor": where < at(bearing) ? "end" : "start" }));
    }
  }
  leaf.strips.push(strip);
  return { strip, clock, MONTHS, text, line, plots };
})();
