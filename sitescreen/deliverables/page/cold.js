// Cold air under the plots, for its own question: contours of depth with ticks toward the deep side, each kind in a line of its own.
const coldAir = (() => {
  const { data, state, draw } = page;
  const INK = "#2b2a27", PAPER = "rgba(250,247,240,0.8)", STEP = 100000, TICK = 4, ROOM = 20, SHORTEST = 26;
  const WAYS = {
    closed: { dash: [], apart: 11, words: "cold air that no outlet drains" },
    leaky: { dash: [6, 3], apart: 13.5, words: "cold air held back behind an outlet" },
    moving: { dash: null, apart: 15, words: "cold air on the move" },
  };
  const map = window.map_plan;
  const isAsked = () => state.question === "cold" && data.cold.length > 0;
  let contours = null; // corners once, at the map's zoom 0
  function unpacked() {
    return data.cold.map((one) => ({ ...one, lines: one.lines.map((steps) => {
      const out = [];
      let lon = 0, lat = 0;
      for (let k = 0; k < steps.length; k += 2) {
        lon += steps[k];
        lat += steps[k + 1];
        out.push(map.project(L.latLng(lat / STEP, lon / STEP), 0));
      }
      return rounded(out);
    }) }));
  }
  // corners cut once, at a quarter of each side; a ring's first corner is cut too
  function rounded(points) {
    const last = points.length - 1, isRing = points[0].x === points[last].x && points[0].y === points[last].y, out = [];
    for (let k = 1; k <= last; k++) {
      const a = points[k - 1], b = points[k], at = (share) => ({ x: a.x + (b.x - a.x) * share, y: a.y + (b.y - a.y) * share });
      out.push(at(k === 1 && !isRing ? 0 : 0.25), at(k === last && !isRing ? 1 : 0.75));
    }
    return isRing ? [...out, out[0]] : out;
  }
  const lengthOf = (points) => points.reduce((sum, p, k) => (k ? sum + Math.hypot(p.x - points[k - 1].x, p.y - points[k - 1].y) : 0), 0);

  // places along a line, evenly apart, each with its direction; north is up, so the deep side lies to the left
  function along(points, apart) {
    const out = [];
    let next = apart / 2;
    for (let k = 1; k < points.length; k++) {
      const a = points[k - 1], b = points[k], long = Math.hypot(b.x - a.x, b.y - a.y);
      while (long > 0 && next <= long) {
        out.push({ x: a.x + ((b.x - a.x) * next) / long, y: a.y + ((b.y - a.y) * next) / long, dx: (b.x - a.x) / long, dy: (b.y - a.y) / long });
        next += apart;
      }
      next -= long;
    }
    return out;
  }
  // closed and leaky air: ticks; moving air: chevrons; both point to the deep side
  function marksOf(kind, points) {
    return along(points, WAYS[kind].apart).map(({ x, y, dx, dy }) => {
      const tip = [x + dy * TICK, y - dx * TICK];
      return kind === "moving" ? [[x - dx * 3, y - dy * 3], tip, [x + dx * 3, y + dy * 3]] : [[x, y], tip];
    });
  }

  function paint(pen, size, onScreen) {
    if (!isAsked()) return;
    contours = contours || unpacked();
    for (const one of contours) {
      const line = new Path2D(), marks = new Path2D();
      for (const part of one.lines) {
        const points = part.map(onScreen);
        if (points.every((p) => p.x < -ROOM) || points.every((p) => p.y < -ROOM) || points.every((p) => p.x > size.x + ROOM) || points.every((p) => p.y > size.y + ROOM)) continue;
        if (lengthOf(points) < SHORTEST) continue; // a speck until the map comes closer
        points.forEach((p, k) => (k ? line.lineTo(p.x, p.y) : line.moveTo(p.x, p.y)));
        for (const mark of marksOf(one.kind, points)) mark.forEach(([x, y], k) => (k ? marks.lineTo(x, y) : marks.moveTo(x, y)));
      }
      const dash = WAYS[one.kind].dash;
      pen.lineJoin = "round";
      for (const [colour, wide] of [[PAPER, 2.6], [INK, one.depth_m >= 30 ? 1.3 : 0.9]]) {
        pen.strokeStyle = colour;
        pen.lineWidth = wide;
        if (dash) {
          pen.setLineDash(dash);
          pen.stroke(line);
          pen.setLineDash([]);
        }
        pen.stroke(marks);
      }
    }
  }

  // the legend's entries, in words
  function key() {
    if (!isAsked()) return [];
    const items = Object.keys(WAYS).filter((kind) => data.cold.some((one) => one.kind === kind)).map((kind) => {
      const svg = draw("svg", { width: 42, height: 14, viewBox: "0 0 42 14", "aria-hidden": "true" }), dash = WAYS[kind].dash;
      const points = [{ x: 1, y: 10 }, { x: 41, y: 10 }], ink = { fill: "none", stroke: INK, "stroke-width": 1.1 };
      if (dash) svg.append(draw("path", { d: "M1 10 H41", "stroke-dasharray": dash.join(" "), ...ink }));
      for (const mark of marksOf(kind, points)) svg.append(draw("path", { d: `M${mark.map((p) => p.join(" ")).join(" L")}`, ...ink }));
      return [svg, WAYS[kind].words];
    });
    return items;
  }
  function says() {
    if (!isAsked()) return "";
    const depths = data.cold_levels_m.map((depth) => depth.toFixed(0));
    return `Lines: where the cold air of a calm clear night is ${depths.slice(0, -1).join(", ")} and ${depths[depths.length - 1]} m deep, with ticks or chevrons toward the deeper side; where it deepens past several at once, one line stands for them.`;
  }
  return { paint, key, says, marksOf };
})();
