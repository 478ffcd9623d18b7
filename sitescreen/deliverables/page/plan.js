// The map: relief, the field of the chosen question, and all plots on one canvas drawn here, in ink.
const plan = (() => {
  const { data, plots, count, state } = page;
  const INK = "#2b2a27", PAPER = "#faf7f0";
  const STEP = 100000, SIGN = 5, LARGE = 16, MOST_NUMBERS = 150, MOST_NUMBERED = 400;
  const ROOM = [34, 30, 40, 52]; // left, top, right, bottom: no plot under a rank's edge or the scale bar at first [px]
  const map = window.map_plan;
  const holder = document.getElementById("map_plan");
  const bounds = L.latLngBounds(data.bounds), focus = L.latLngBounds(data.focus);
  // Web Mercator at zoom 0, as the map library has it; spelt out, since ten thousand plots have many corners
  function toMercator(lon, lat) {
    const sine = Math.sin((Math.max(-85.0511287798, Math.min(85.0511287798, lat)) * Math.PI) / 180);
    return { x: 128 + (lon * 128) / 180, y: 128 - (Math.log((1 + sine) / (1 - sine)) * 64) / Math.PI };
  }

  // corners once, in the map's own units at zoom 0; a zoom only scales them
  const shapes = data.shapes.map((rings) => rings.map((steps) => {
    const points = [];
    let lon = 0, lat = 0;
    for (let k = 0; k < steps.length; k += 2) {
      lon += steps[k];
      lat += steps[k + 1];
      points.push(toMercator(lon / STEP, lat / STEP));
    }
    return points;
  }));
  const places = plots.lon.map((lon, i) => {
    if (lon !== null && plots.lat[i] !== null) return toMercator(lon, plots.lat[i]);
    return shapes[i].length ? shapes[i][0][0] : null;
  });

  // how far a plot reaches from its place, at zoom 0
  const reaches = shapes.map((rings, i) => {
    let reach = 0;
    if (places[i]) for (const ring of rings) for (const p of ring) reach = Math.max(reach, Math.abs(p.x - places[i].x), Math.abs(p.y - places[i].y));
    return reach;
  });

  const canvas = document.createElement("canvas");
  canvas.className = "plots leaflet-zoom-hide";
  let scale = 1, origin = L.point(0, 0), spots = [], spotOf = new Map(), overlay = null;
  const movers = []; // told whenever the ground has moved under the glass

  let hatched = null;
  function hatch(context) {
    if (hatched) return hatched;
    const tile = document.createElement("canvas");
    tile.width = tile.height = 6;
    const pen = tile.getContext("2d");
    pen.strokeStyle = INK;
    pen.lineWidth = 0.8;
    pen.beginPath();
    pen.moveTo(-1, 7); pen.lineTo(7, -1);
    pen.moveTo(-1, 1); pen.lineTo(1, -1);
    pen.moveTo(5, 7); pen.lineTo(7, 5);
    pen.stroke();
    hatched = context.createPattern(tile, "repeat");
    return hatched;
  }
  const onScreen = (point) => ({ x: point.x * scale - origin.x, y: point.y * scale - origin.y });

  function redraw() {
    const size = map.getSize(), ratio = Math.max(window.devicePixelRatio || 1, holder.classList.contains("printing") ? 3 : 1);
    canvas.width = size.x * ratio;
    canvas.height = size.y * ratio;
    canvas.style.width = `${size.x}px`;
    canvas.style.height = `${size.y}px`;
    L.DomUtil.setPosition(canvas, map.containerPointToLayerPoint([0, 0]));
    scale = map.getZoomScale(map.getZoom(), 0);
    origin = map.project(map.containerPointToLatLng([0, 0]), map.getZoom());
    const context = canvas.getContext("2d");
    context.scale(ratio, ratio);
    const taken = drawPlots(context, size);
    if (holder.classList.contains("printing")) {
      drawGround(context, size);
      landmarks.paint(context, size, onScreen, taken);
      ladder.paintLeaders(context, size);
      drawPlots(context, size);
    } else {
      landmarks.show(size, scale, origin, ratio, taken);
    }
    frame.draw(context, size, map);
    for (const moved of movers) moved();
  }

  // on paper everything goes onto the one canvas: browsers print a clear canvas as a white one
  function drawGround(context, size) {
    const north = map.latLngToContainerPoint(bounds.getNorthWest()), south = map.latLngToContainerPoint(bounds.getSouthEast());
    const box = [north.x, north.y, south.x - north.x, south.y - north.y];
    context.fillStyle = "#f5f0e5";
    context.fillRect(0, 0, size.x, size.y);
    context.drawImage(document.getElementById("relief"), ...box);
    if (!overlay) return;
    context.globalCompositeOperation = "multiply";
    context.globalAlpha = 0.78;
    context.drawImage(overlay.getElement(), ...box);
    context.globalCompositeOperation = "source-over";
    context.globalAlpha = 1;
  }

  // signs of small plots, each drawn once and then stamped: there may be ten thousand
  const STAMP = 2 * SIGN + 4;
  let stamps = null;
  function stamp(kind, ratio) {
    if (!stamps || stamps.ratio !== ratio) stamps = { ratio };
    if (stamps[kind]) return stamps[kind];
    const tile = document.createElement("canvas");
    tile.width = tile.height = Math.ceil(STAMP * ratio);
    const pen = tile.getContext("2d");
    pen.scale(ratio, ratio);
    const shape = new Path2D();
    shape.rect(STAMP / 2 - SIGN, STAMP / 2 - SIGN, 2 * SIGN, 2 * SIGN);
    drawShape(pen, shape, kind === "aside" ? hatch(pen) : data.ramp[kind] || PAPER, kind === "aside", false);
    if (kind === "unknown") drawDot(pen, STAMP / 2, STAMP / 2);
    stamps[kind] = tile;
    return tile;
  }
  function drawDot(context, x, y) {
    context.fillStyle = INK;
    context.beginPath();
    context.arc(x, y, 1.5, 0, 7);
    context.fill();
  }
  let drawing = null; // those set aside lie lowest, the first rank on top
  const drawingOrder = () => (drawing = drawing || [...page.aside, ...[...page.ranked].reverse()].filter((i) => places[i]));

  function drawPlots(context, size) {
    const marks = page.marks(), stripes = hatch(context), ratio = canvas.width / size.x;
    const taken = [], chosen = state.chosen;
    spots = [];
    spotOf = new Map();
    const drawOne = (i) => {
      const x = places[i].x * scale - origin.x, y = places[i].y * scale - origin.y;
      if (x < -60 || y < -60 || x > size.x + 60 || y > size.y + 60) return;
      const half = reaches[i] * scale, isSign = 2 * half < LARGE;
      const isAside = plots.rank[i] === null, mark = isAside ? null : marks[i];
      const number = page.classOf(mark), isUnknown = !isAside && number === null && page.asks(i);
      let shape = null;
      if (isSign && i !== chosen) {
        const kind = isAside ? "aside" : number !== null ? number : isUnknown ? "unknown" : "unasked";
        const left = Math.round((x - STAMP / 2) * ratio) / ratio, top = Math.round((y - STAMP / 2) * ratio) / ratio; // whole pixels stay sharp
        const tile = stamp(kind, ratio);
        context.drawImage(tile, left, top, tile.width / ratio, tile.height / ratio);
      } else {
        shape = outline(i, { x, y }, isSign);
        drawShape(context, shape, isAside ? stripes : number === null ? PAPER : data.ramp[number], isAside, i === chosen);
        if (isUnknown) drawDot(context, x, y);
      }
      const room = isSign ? SIGN : half;
      spotOf.set(i, spots.length);
      spots.push({ i, x, y, half: room, shape });
      taken.push([x - room, y - room, x + room, y + room]);
    };
    for (const i of drawingOrder()) if (i !== chosen) drawOne(i);
    if (chosen !== null && places[chosen]) drawOne(chosen);
    drawNumbers(context, size, taken);
    return taken;
  }

  function drawShape(context, shape, colour, isAside, isChosen) {
    context.lineJoin = "miter";
    // the chosen plot has a double outline in ink
    for (const [around, wide] of isChosen ? [[PAPER, 12], [INK, 9], [PAPER, 6]] : [[PAPER, 3.6]]) {
      context.strokeStyle = around;
      context.lineWidth = wide;
      context.stroke(shape);
    }
    if (isAside) {
      context.fillStyle = PAPER;
      context.globalAlpha = 0.7;
      context.fill(shape, "evenodd");
      context.globalAlpha = 1;
    }
    context.fillStyle = colour;
    context.fill(shape, "evenodd");
    context.strokeStyle = INK;
    context.lineWidth = 1.2;
    context.setLineDash(isAside ? [2.6, 2] : []);
    context.stroke(shape);
    context.setLineDash([]);
  }

  function outline(i, at, isSign) {
    const shape = new Path2D();
    if (isSign) shape.rect(at.x - SIGN, at.y - SIGN, 2 * SIGN, 2 * SIGN);
    else for (const ring of shapes[i]) {
      ring.map(onScreen).forEach((p, k) => (k ? shape.lineTo(p.x, p.y) : shape.moveTo(p.x, p.y)));
      shape.closePath();
    }
    return shape;
  }

  // ranks beside their ground: the chosen plot and the shortlist always, others where there is room
  function drawNumbers(context, size, taken) {
    context.textBaseline = "middle";
    const ranks = page.now.rank;
    const seen = page.now.order.map((i) => spotOf.get(i)).filter((k) => k !== undefined).map((k) => spots[k]);
    const first = seen.filter((s) => s.i === state.chosen);
    const serif = getComputedStyle(document.body).getPropertyValue("--serif");
    for (const spot of [...first, ...seen.filter((s) => s.i !== state.chosen)].slice(0, MOST_NUMBERS)) {
      const rank = ranks[spot.i], isChosen = spot.i === state.chosen, isShort = rank <= data.shortlist;
      if (!isShort && !isChosen && (size.x < 600 || spots.length > MOST_NUMBERED)) continue;
      context.font = `${isShort || isChosen ? "bold 15" : "12"}px ${serif}`;
      const text = page.ordinal(rank), wide = context.measureText(text).width, tall = isShort || isChosen ? 15 : 12;
      const gap = spot.half + (isChosen ? 9 : 5);
      const tries = [[gap, 0], [-gap - wide, 0], [-wide / 2, -gap - tall / 2], [-wide / 2, gap + tall / 2]];
      for (const [dx, dy] of tries) {
        const x = spot.x + dx, y = spot.y + dy;
        const box = [x - 2, y - tall / 2, x + wide + 2, y + tall / 2];
        const clear = taken.every((t) => box[2] < t[0] || box[0] > t[2] || box[3] < t[1] || box[1] > t[3]);
        if (!clear && !(isChosen && dx === gap)) continue;
        taken.push(box);
        if (isChosen) {
          context.fillStyle = INK;
          context.fillRect(x - 4, y - tall / 2 - 2, wide + 8, tall + 4);
          context.fillStyle = PAPER;
        } else {
          context.fillStyle = "rgba(250,247,240,0.86)";
          context.fillRect(x - 2, y - tall / 2 - 0.5, wide + 4, tall + 1);
          context.fillStyle = INK;
        }
        context.fillText(text, x, y + 0.5);
        break;
      }
    }
  }

  function plotAt(point) {
    let best = null, nearest = 12;
    const context = canvas.getContext("2d"), ratio = canvas.width / map.getSize().x;
    for (const spot of spots) {
      const away = Math.max(Math.abs(spot.x - point.x), Math.abs(spot.y - point.y));
      if (away < nearest && away <= Math.max(spot.half, 9)) { best = spot.i; nearest = away; }
      else if (best === null && spot.half > 12 && spot.shape && context.isPointInPath(spot.shape, point.x * ratio, point.y * ratio)) best = spot.i;
    }
    return best;
  }

  const readout = document.getElementById("readout");
  const idle = () => (window.matchMedia("(pointer: coarse)").matches ? "Tap a plot to read its leaf." : "Choose a plot on the map or in the table to read its leaf.");
  function tell(i) {
    readout.textContent = i === null ? idle() : told(i);
  }
  function told(i) {
    const isAside = plots.rank[i] === null, rank = page.now.rank[i], mark = page.marks()[i], one = page.question();
    const asked = isAside ? "" : mark === null ? (page.asks(i) ? ", unknown" : "") : `, ${mark.toFixed(0)} of 100${one ? ` for ${one.column.toLowerCase()}` : ""}`;
    return page.called(i) + (isAside ? ": set aside" : `: ${rank === null ? "no rank" : page.ordinal(rank)}${asked}`);
  }

  function showField() {
    if (overlay) overlay.remove();
    overlay = null;
    const one = page.question(), view = one && one.views[state.view];
    if (view) overlay = L.imageOverlay(view.picture, bounds, { className: "field", alt: view.title, interactive: false }).addTo(map);
  }

  function whole() {
    map.fitBounds(focus, { animate: false });
    map.panInsideBounds(bounds, { animate: false }); // no bare paper on one side where there is ground on the other
    const shown = places.filter((place) => place && focus.contains(map.unproject(L.point(place), 0))).map((place) => map.unproject(L.point(place), 0));
    const size = map.getSize(), [left, top, right, bottom] = ROOM;
    const hasRoom = shown.map((where) => map.latLngToContainerPoint(where))
      .every((at) => at.x >= left && at.y >= top && at.x <= size.x - right && at.y <= size.y - bottom);
    if (!hasRoom) map.fitBounds(L.latLngBounds(shown), { animate: false, paddingTopLeft: [left, top], paddingBottomRight: [right, bottom], maxZoom: map.getZoom() });
  }

  function start() {
    document.getElementById("picture").hidden = true;
    holder.hidden = false;
    document.getElementById("map-buttons").hidden = false;
    readout.hidden = false;
    map.invalidateSize({ animate: false });
    map.setMaxZoom(18);
    map.setMaxBounds(null);
    L.imageOverlay(document.getElementById("relief").src, bounds, { alt: "", interactive: false }).addTo(map);
    map.createPane("plots").style.zIndex = 450;
    map.getPane("plots").append(canvas);
    whole();
    map.setMinZoom(Math.min(map.getZoom() - 1, 16));
    map.on("move zoomend viewreset resize", redraw);
    map.on("click", (event) => {
      const i = plotAt(event.containerPoint);
      if (i !== null) page.change({ chosen: i });
      tell(i);
    });
    map.on("mousemove", (event) => {
      const i = plotAt(event.containerPoint);
      holder.style.cursor = i === null ? "" : "pointer";
      holder.title = i === null ? "" : told(i);
      tell(i);
    });
    map.on("mouseout", () => tell(null));
    document.getElementById("closer").addEventListener("click", () => map.zoomIn());
    document.getElementById("farther").addEventListener("click", () => map.zoomOut());
    document.getElementById("whole").addEventListener("click", whole);
    page.watchers.push((what) => {
      if ("question" in what || "view" in what) showField();
      redraw();
    });
    showOnline();
    tell(null);
    redraw();
  }

  // on paper the map has a size of its own and shows all plots
  function print(isPrinting) {
    holder.classList.toggle("printing", isPrinting);
    // outside the panes, which paper draws a little smaller than the frame around them
    (isPrinting ? holder : map.getPane("plots")).append(canvas);
    map.invalidateSize({ animate: false });
    if (isPrinting) whole();
    redraw();
  }

  // pictures from the server that the brief names, only once the reader asks for them
  function showOnline() {
    if (!data.online) return;
    const server = new URL(data.online.address.replace(/[{}]/g, "")).host;
    const ask = page.make("button", { type: "button", id: "online", "aria-pressed": "false", title: `Asks ${server} for pictures of this part of the map` }, "online map");
    const told = page.make("span", { class: "credit" });
    document.getElementById("map-buttons").append(ask);
    readout.after(told);
    let tiles = null;
    ask.addEventListener("click", () => {
      if (tiles) { tiles.remove(); tiles = null; told.textContent = ""; }
      else {
        tiles = L.tileLayer(data.online.address, { maxZoom: 18, opacity: 0.6 }).addTo(map);
        told.textContent = data.online.credit || server;
        tiles.once("tileerror", () => { told.textContent = `${server} does not answer`; });
      }
      ask.setAttribute("aria-pressed", String(Boolean(tiles)));
    });
  }

  // bring a plot into view, without moving the map when it is there already
  function reveal(i) {
    if (!places[i]) return;
    const where = map.unproject(L.point(places[i]), 0);
    if (!map.getBounds().pad(-0.05).contains(where) && bounds.pad(0.5).contains(where)) map.panTo(where, { animate: false });
  }
  // where a plot's ground lies on the map's window, and how far its sign reaches; null where it is out of sight
  function groundOf(i) {
    const spot = spots[spotOf.get(i)];
    return spot ? { x: spot.x, y: spot.y, half: Math.min(spot.half, 400) } : null;
  }
  return { start, reveal, print, groundOf, movers, screenOf: (i) => { const s = spots[spotOf.get(i)]; return s ? [s.x, s.y] : null; } };
})();
