// What stands along the edge of the map, as on a plan: degrees, a north arrow and a scale bar.
const frame = (() => {
  const INK = "#2b2a27";
  const STEPS_DEG = [10, 5, 2, 1, 0.5, 20 / 60, 10 / 60, 5 / 60, 2 / 60, 1 / 60, 0.5 / 60];
  function degrees(value, letters) {
    const whole = Math.abs(value), minutes = Math.round(whole * 600) / 10;
    const d = Math.floor(minutes / 60 + 1e-9), m = Math.round((minutes - 60 * d) * 10) / 10;
    return `${d}°${m ? `${m}′` : ""}${value < 0 ? letters[1] : letters[0]}`;
  }
  // ticks along the edge, a north arrow and a scale bar, as on a plan
  function draw(context, size, map) {
    const view = map.getBounds();
    context.font = "11px " + getComputedStyle(document.body).getPropertyValue("--sans");
    context.lineWidth = 1;
    const label = (text, x, y, align, base) => {
      context.textAlign = align;
      context.textBaseline = base;
      context.strokeStyle = "rgba(250,247,240,0.9)";
      context.lineWidth = 3;
      context.strokeText(text, x, y);
      context.fillStyle = "#4b473e";
      context.fillText(text, x, y);
    };
    const tick = (x0, y0, x1, y1) => {
      context.strokeStyle = INK;
      context.lineWidth = 1;
      context.beginPath();
      context.moveTo(x0, y0);
      context.lineTo(x1, y1);
      context.stroke();
    };
    const stepFor = (span, most) => STEPS_DEG.filter((s) => span / s <= most).pop() || 10;
    const stepX = stepFor(view.getEast() - view.getWest(), Math.max(2, size.x / 150));
    for (let lon = Math.ceil(view.getWest() / stepX) * stepX; lon < view.getEast(); lon += stepX) {
      const x = map.latLngToContainerPoint([view.getCenter().lat, lon]).x;
      tick(x, 0, x, 7);
      tick(x, size.y, x, size.y - 7);
      if (x > 40 && x < size.x - 170) label(degrees(lon, "EW"), x, 10, "center", "top");
    }
    const stepY = stepFor(view.getNorth() - view.getSouth(), Math.max(2, size.y / 120));
    for (let lat = Math.ceil(view.getSouth() / stepY) * stepY; lat < view.getNorth(); lat += stepY) {
      const y = map.latLngToContainerPoint([lat, view.getCenter().lng]).y;
      tick(0, y, 7, y);
      tick(size.x, y, size.x - 7, y);
      if (y > 30 && y < size.y - 60) label(degrees(lat, "NS"), 11, y, "left", "middle");
    }
    const y = size.y - 16, x = 44;
    const metres = map.distance(map.containerPointToLatLng([0, size.y / 2]), map.containerPointToLatLng([100, size.y / 2])) / 100;
    const most = metres * Math.min(190, size.x / 3), unit = 10 ** Math.floor(Math.log10(most));
    const long = [5, 2, 1].map((k) => k * unit).find((k) => k <= most);
    const wide = long / metres;
    context.fillStyle = "rgba(250,247,240,0.82)";
    context.fillRect(12, y - 21, 32 + wide + 28, 31);
    tick(x, y, x + wide, y);
    for (const part of [0, 0.5, 1]) tick(x + part * wide, y - 4, x + part * wide, y);
    label("0", x, y - 6, "center", "bottom");
    label(long >= 1000 ? `${long / 1000} km` : `${long} m`, x + wide, y - 6, "center", "bottom");
    context.beginPath();
    context.moveTo(24, y - 17); context.lineTo(28, y - 2); context.lineTo(24, y - 5.5); context.lineTo(20, y - 2);
    context.closePath();
    context.fillStyle = INK;
    context.fill();
    label("N", 24, y + 8, "center", "bottom");
    context.textAlign = "left";
  }
  return { draw };
})();
