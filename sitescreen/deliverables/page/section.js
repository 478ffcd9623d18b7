// The ground to the shore that the breeze comes from, and the year by hours: side by side below the all-round strip.
const section = (() => {
  const { data, plots, make, draw } = page;
  const { text, line, clock, MONTHS } = around;
  const INK = "#2b2a27", PAPER = "#faf7f0";
  let number = 0;

  function hatching(svg, name, path, wide) {
    const id = `${name}-${++number}`;
    const pattern = draw("pattern", { id, width: 6, height: 6, patternUnits: "userSpaceOnUse" }, path(wide));
    svg.append(draw("defs", {}, pattern));
    return `url(#${id})`;
  }
  const strokes = (wide) => draw("path", { d: "M-1 7 L7 -1 M-1 1 L1 -1 M5 7 L7 5", stroke: INK, "stroke-width": wide, fill: "none" });
  const dots = (wide) => draw("circle", { cx: 3, cy: 3, r: wide, fill: INK });
  const metres = (value) => (value >= 1000 ? `${(value / 1000).toFixed(1)} km` : `${Math.round(value / 10) * 10} m`);

  function toShore(i, width) {
    const one = data.strips.plots[i] && data.strips.plots[i].section;
    if (!one || one.distance.length < 3 || one.ground.every((h) => h === null)) return null;
    const tall = 204, left = 44, right = 16, top = 46, foot = 30;
    const reach = one.distance[one.distance.length - 1], known = one.ground.filter((h) => h !== null);
    const kind = (data.readings.find((each) => each.name === "shore_kind") || { values: [] }).values[i];
    const seen = one.shore !== null && one.shore <= reach * 1.02, level = seen ? one.ground[one.ground.length - 1] ?? Math.min(...known) : Math.min(...known);
    const depth = data.strips.depths[kind] || null, ceiling = seen && depth ? level + depth : null;
    const low = Math.min(...known), high = Math.max(...known, ceiling === null ? -Infinity : Math.min(ceiling, level + 1.15 * depth));
    const span = Math.max(high - low, 60);
    const x = (d) => left + (d / reach) * (width - left - right), y = (h) => tall - foot - ((h - low) / span) * (tall - top - foot);
    const exaggeration = ((tall - top - foot) / span) / ((width - left - right) / reach);
    const svg = draw("svg", { class: "section", role: "img", viewBox: `0 0 ${width} ${tall}`, width, height: tall });
    const ground = one.ground.map((h, k) => [x(one.distance[k]), y(h ?? low)]);
    const path = ground.map(([px, py], k) => `${k ? "L" : "M"}${px.toFixed(1)} ${py.toFixed(1)}`).join("");
    if (ceiling !== null) {
      svg.append(draw("path", { d: `M${x(0)} ${y(ceiling)} H${x(reach)} V${tall - foot} H${x(0)} Z`, fill: hatching(svg, "breeze", strokes, 0.45) }), line(x(0), y(ceiling), x(reach), y(ceiling), "#6a6457", 0.8, { "stroke-dasharray": "5 3" }),
        text(x(reach) - 4, y(ceiling) - 5, `the breeze reaches up to about ${depth.toFixed(0)} m above the ${kind}`, { "text-anchor": "end", class: "tiny halo" }));
    }
    if (one.crest_at !== null && one.crest !== null) {
      const k = one.distance.findIndex((d) => d >= one.crest_at), lee = ground.slice(0, Math.max(k, 1) + 1);
      if (k > 0) svg.append(draw("path", { d: `M${lee.map(([px, py]) => `${px.toFixed(1)} ${py.toFixed(1)}`).join(" L")} Z`, fill: PAPER }), draw("path", { d: `M${lee.map(([px, py]) => `${px.toFixed(1)} ${py.toFixed(1)}`).join(" L")} Z`, fill: hatching(svg, "lee", dots, 0.9) }));
    }
    svg.append(draw("path", { d: `${path} L${x(reach).toFixed(1)} ${tall - foot + 4} L${x(0)} ${tall - foot + 4} Z`, fill: INK }));
    for (const h of [low, low + span]) svg.append(line(left - 5, y(h), left, y(h)), text(left - 8, y(h) + 4, `${h.toFixed(0)} m`, { "text-anchor": "end" }));
    const place = (px, py, words, anchor = "middle", rise = 14) => svg.append(line(px, py - 3, px, py - rise, INK, 1), text(px, py - rise - 4, words, { "text-anchor": anchor, class: "tiny strong halo" }));
    place(x(0), y(one.ground[0] ?? low), "the plot", "start");
    const told = [];
    if (one.crest_at !== null && one.crest !== null) {
      const px = x(one.crest_at), words = `crest ${one.crest.toFixed(0)} m, ${metres(one.crest_at)} away`;
      place(px, y(one.crest), words, px < 130 ? "start" : px > width - 90 ? "end" : "middle", px < 130 && y(one.crest) < tall - foot - 40 ? 28 : 14);
      told.push(`The ground that makes the skyline that way is a ${words}; dotted: what lies below the line from it to the plot.`);
    }
    if (seen) svg.append(text(x(reach), tall - foot + 18, `shore, ${metres(one.shore)}`, { "text-anchor": "end", class: "tiny strong" }));
    else if (one.shore !== null) svg.append(text(x(reach), tall - foot + 18, `the shore lies ${metres(one.shore)} away, beyond this drawing`, { "text-anchor": "end", class: "tiny strong" }));
    svg.append(text(x(0), tall - foot + 18, "0"));
    told.push(`Heights are drawn ${exaggeration < 1.5 ? "about true to scale" : `${exaggeration < 10 ? exaggeration.toFixed(1) : Math.round(exaggeration)} times too tall`}.`);
    const where = one.bearing === null ? "" : `, towards ${one.bearing.toFixed(0)}°`;
    svg.setAttribute("aria-label", `Section from the plot to the shore${where}. ${told.join(" ")}`);
    return make("div", {}, make("h3", { class: "strip-head" }, `From the plot to the shore${where}`), svg, make("p", { class: "strip-note" }, told.join(" ")));
  }

  function year(i, width) {
    const one = data.strips.plots[i];
    if (!one || !one.hours) return null;
    const from = 5, to = 20, left = 44, top = 6, tall = 9, foot = 34;
    const wide = (width - left - 6) / 12, height = (to - from) * tall;
    const svg = draw("svg", { class: "year", role: "img", viewBox: `0 0 ${width} ${top + height + foot}`, width, height: top + height + foot });
    const fill = hatching(svg, "shade", strokes, 1);
    for (let m = 0; m < 12; m++) {
      for (let h = from; h < to; h++) {
        const state = one.hours[24 * m + h], box = { x: left + m * wide, y: top + (h - from) * tall, width: wide, height: tall };
        if (state === "0") svg.append(draw("rect", { ...box, fill: "#6a6457" }));
        else if (state === "1") svg.append(draw("rect", { ...box, fill }));
      }
      svg.append(text(left + (m + 0.5) * wide, top + height + 13, wide > 34 ? MONTHS[m].slice(0, 3) : MONTHS[m][0], { "text-anchor": "middle" }));
      const season = one.hot.includes(m) ? "hot" : one.cool.includes(m) ? "cool" : "";
      if (season) svg.append(text(left + (m + 0.5) * wide, top + height + 27, wide > 24 ? season : season[0], { "text-anchor": "middle", class: "tiny strong" }));
      if (m) svg.append(line(left + m * wide, top, left + m * wide, top + height, PAPER, 1));
    }
    svg.append(draw("rect", { x: left, y: top, width: 12 * wide, height, fill: "none", stroke: INK, "stroke-width": 1 }));
    for (let h = 6; h <= 18; h += 3) svg.append(line(left - 4, top + (h - from) * tall, left, top + (h - from) * tall), text(left - 7, top + (h - from) * tall + 4, `${h}:00`, { "text-anchor": "end" }));
    const shaded = [...one.hours].filter((state) => state === "1").length;
    const hours = one.first.map((h, m) => (h === null ? 0 : one.last[m] - h));
    const told = `Clear sky: light is sun, dark is night, hatched is the shade of the ground around${shaded ? "" : ", of which there is none for most of any hour"}. `
      + `Longest from first to last sun in ${MONTHS[hours.indexOf(Math.max(...hours))]}, shortest in ${MONTHS[hours.indexOf(Math.min(...hours))]}${one.first[0] === null ? "" : `; in January from ${clock(one.first[0])} to ${clock(one.last[0])}`}.`;
    svg.setAttribute("aria-label", `The year by hours. ${told}`);
    return make("div", {}, make("h3", { class: "strip-head" }, "Sun through the year, by the clock"), svg, make("p", { class: "strip-note" }, told));
  }

  leaf.strips.push((i, room) => {
    // side by side on wide screens, and on paper
    const width = Math.max(300, room), half = width < 640 ? width : Math.floor((width - (width < 860 ? 24 : 40)) / 2);
    const parts = [toShore(i, half), year(i, half)].filter((part) => part);
    return parts.length ? [make("div", { class: "pair" }, ...parts)] : [];
  });
  return { plots };
})();
