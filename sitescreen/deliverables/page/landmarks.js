// Landmarks under the plots: roads, rivers, places, each layer in a line of its own, and their names where there is room.
const landmarks = (() => {
  const { data, make, draw } = page;
  const INK = "#2b2a27", SOFT = "#5c5648", PAPER = "rgba(250,247,240,0.85)", STEP = 100000;
  const DASHES = [[], [7, 3], [1.5, 3], [9, 3, 1.5, 3]];
  const MOST_NAMES = 60, LONGEST_NAME = 40;
  const map = window.map_plan;
  const canvas = document.createElement("canvas");
  canvas.className = "landmarks leaflet-zoom-hide";

  function corners(steps) {
    const out = [];
    let lon = 0, lat = 0;
    for (let k = 0; k < steps.length; k += 2) {
      lon += steps[k];
      lat += steps[k + 1];
      out.push(map.project(L.latLng(lat / STEP, lon / STEP), 0));
    }
    return out;
  }
  const layers = data.landmarks.map((layer, n) => ({
    name: layer.name,
    dash: DASHES[n % DASHES.length],
    things: layer.things.map((thing) => ({ label: thing.label, kind: thing.kind, parts: thing.parts.map(corners), at: thing.at ? corners(thing.at)[0] : null })),
  }));

  // the longest stretch of a line within the window, as a place for its name: middle and direction
  function stretch(points, size, wide) {
    let best = null, run = [];
    const close = () => {
      if (run.length < 2) return;
      const first = run[0], last = run[run.length - 1], chord = Math.hypot(last.x - first.x, last.y - first.y);
      if (chord > wide * 1.15 && (!best || chord > best.chord)) best = { chord, x: (first.x + last.x) / 2, y: (first.y + last.y) / 2, run: [...run] };
    };
    for (const p of points) {
      if (p.x < 20 || p.y < 20 || p.x > size.x - 20 || p.y > size.y - 20) { close(); run = []; continue; }
      run.push(p);
      // a stretch ends where the line has bent away from its beginning
      if (run.length > 2) {
        const a = run[0], b = run[Math.floor(run.length / 2)], turn = Math.atan2(b.y - a.y, b.x - a.x) - Math.atan2(p.y - b.y, p.x - b.x);
        if (Math.abs(Math.atan2(Math.sin(turn), Math.cos(turn))) > 0.5) { run.pop(); close(); run = [p]; }
      }
    }
    close();
    if (!best) return null;
    const near = best.run.reduce((p, q) => (Math.hypot(q.x - best.x, q.y - best.y) < Math.hypot(p.x - best.x, p.y - best.y) ? q : p));
    const first = best.run[0], last = best.run[best.run.length - 1];
    let angle = Math.atan2(last.y - first.y, last.x - first.x);
    if (Math.abs(angle) > Math.PI / 2) angle += angle > 0 ? -Math.PI : Math.PI;
    return { x: near.x, y: near.y, angle };
  }

  // taken: boxes of plots and ranks, which names give way to
  function show(size, scale, origin, ratio, taken) {
    canvas.width = size.x * ratio;
    canvas.height = size.y * ratio;
    canvas.style.width = `${size.x}px`;
    canvas.style.height = `${size.y}px`;
    L.DomUtil.setPosition(canvas, map.containerPointToLayerPoint([0, 0]));
    const pen = canvas.getContext("2d");
    pen.scale(ratio, ratio);
    paint(pen, size, (p) => ({ x: p.x * scale - origin.x, y: p.y * scale - origin.y }), taken);
  }
  function paint(pen, size, onScreen, taken) {
    const names = [];
    coldAir.paint(pen, size, onScreen);
    for (const layer of layers) {
      for (const thing of layer.things) {
        const parts = thing.parts.map((part) => part.map(onScreen));
        if (thing.kind === "point") {
          const at = parts[0][0];
          if (at.x < 0 || at.y < 0 || at.x > size.x || at.y > size.y) continue;
          pen.beginPath();
          pen.arc(at.x, at.y, 2.6, 0, 7);
          pen.fillStyle = PAPER;
          pen.strokeStyle = INK;
          pen.lineWidth = 1.2;
          pen.fill();
          pen.stroke();
          taken.push([at.x - 4, at.y - 4, at.x + 4, at.y + 4]);
          if (thing.label) names.push({ order: 0, label: thing.label, kind: "point", x: at.x, y: at.y });
          continue;
        }
        const path = new Path2D();
        for (const part of parts) part.forEach((p, k) => (k ? path.lineTo(p.x, p.y) : path.moveTo(p.x, p.y)));
        pen.lineJoin = "round";
        if (thing.kind === "line") {
          pen.setLineDash([]);
          pen.strokeStyle = PAPER;
          pen.lineWidth = 3.4;
          pen.stroke(path);
        }
        pen.setLineDash(layer.dash);
        pen.strokeStyle = SOFT;
        pen.lineWidth = thing.kind === "line" ? 1.2 : 0.8;
        pen.stroke(path);
        pen.setLineDash([]);
        if (thing.label) names.push({ order: thing.kind === "area" ? 1 : 2, label: thing.label, kind: thing.kind, parts, at: thing.at ? onScreen(thing.at) : null });
      }
    }
    const written = new Set();
    for (const name of names.sort((a, b) => a.order - b.order)) {
      if (written.size >= MOST_NAMES) break;
      if (!(name.kind !== "point" && written.has(name.label)) && write(pen, size, name, taken)) written.add(name.label);
    }
  }

  function write(pen, size, name, taken) {
    const text = name.label.length > LONGEST_NAME ? `${name.label.slice(0, LONGEST_NAME - 1)}…` : name.label;
    const serif = getComputedStyle(document.body).getPropertyValue("--serif");
    pen.font = name.kind === "point" ? `13px ${serif}` : `italic ${name.kind === "area" ? 14 : 12}px ${serif}`;
    const wide = pen.measureText(text).width, tall = 14;
    const spots = name.kind === "point"
      ? [[name.x + 6 + wide / 2, name.y], [name.x - 6 - wide / 2, name.y], [name.x, name.y - 12], [name.x, name.y + 12]].map(([x, y]) => ({ x, y, angle: 0 }))
      : name.kind === "area" ? [0, -24, 24, -48, 48].map((y) => ({ x: name.at.x, y: name.at.y + y, angle: 0 }))
      : name.parts.map((part) => stretch(part, size, wide)).filter((spot) => spot);
    for (const { x, y, angle } of spots) {
      const halfX = (Math.abs(Math.cos(angle)) * wide + Math.abs(Math.sin(angle)) * tall) / 2, halfY = (Math.abs(Math.sin(angle)) * wide + Math.abs(Math.cos(angle)) * tall) / 2;
      const box = [x - halfX - 2, y - halfY, x + halfX + 2, y + halfY];
      if (box[0] < 12 || box[1] < 12 || box[2] > size.x - 12 || box[3] > size.y - 12) continue;
      if (taken.some((t) => box[2] >= t[0] && box[0] <= t[2] && box[3] >= t[1] && box[1] <= t[3])) continue;
      taken.push(box);
      pen.save();
      pen.translate(x, y);
      pen.rotate(angle);
      pen.textAlign = "center";
      pen.textBaseline = "middle";
      pen.lineJoin = "round";
      pen.strokeStyle = PAPER;
      pen.lineWidth = 3.5;
      pen.strokeText(text, 0, 0);
      pen.fillStyle = name.kind === "point" ? INK : SOFT;
      pen.fillText(text, 0, 0);
      pen.restore();
      return true;
    }
    return false;
  }

  // each layer's line and name, for the legend
  function key() {
    return layers.map((layer) => {
      const isPoints = layer.things.every((thing) => thing.kind === "point");
      const mark = isPoints ? draw("circle", { cx: 11, cy: 7.5, r: 2.8, fill: "none", stroke: INK, "stroke-width": 1.2 })
        : draw("line", { x1: 0, y1: 7.5, x2: 22, y2: 7.5, stroke: SOFT, "stroke-width": 1.4, "stroke-dasharray": layer.dash.join(" ") });
      return [draw("svg", { width: 22, height: 15, viewBox: "0 0 22 15", "aria-hidden": "true" }, mark), make("bdi", {}, layer.name)];
    });
  }
  function start() {
    map.createPane("landmarks").style.zIndex = 430;
    map.getPane("landmarks").append(canvas);
  }
  return { start, show, paint, key };
})();
