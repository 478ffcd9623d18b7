// The questions weighed anew, by the arithmetic of the program: the same numbers, added in the same order.
const weigh = (() => {
  const { data, plots, count } = page;
  const STOPS = [
    { factor: 0, word: "not at all", counts: "does not count", counting: "not counting" },
    { factor: 0.5, word: "half", counts: "counts half", counting: "counting half" },
    { factor: 1, word: "as the profile", counts: "counts as in the profile", counting: "counting as in the profile" },
    { factor: 2, word: "double", counts: "counts double", counting: "counting double" },
    { factor: 4, word: "four times", counts: "counts four times", counting: "counting four times" },
  ];
  const PROFILE = 2;
  const isRanked = plots.rank.map((rank) => rank !== null);
  const stops = Object.fromEntries(data.questions.map((one) => [one.name, PROFILE]));
  let zones = null;

  function unpacked(text, count) {
    if (typeof text === "number") return new Float64Array(count).fill(text);
    const letters = atob(text), bytes = new Uint8Array(letters.length);
    for (let k = 0; k < letters.length; k++) bytes[k] = letters.charCodeAt(k);
    const view = new DataView(bytes.buffer), out = new Float64Array(bytes.length / 8);
    for (let k = 0; k < out.length; k++) out[k] = view.getFloat64(8 * k, true);
    return out;
  }
  function unpackedZones() {
    return data.weighing.zones.map((zone) => ({
      name: zone.zone,
      rows: zone.rows,
      shares: unpacked(zone.shares, zone.rows.length),
      criteria: zone.criteria.map((one) => {
        const known = unpacked(one.known, zone.rows.length);
        if (!one.gaps) return { question: one.question, weight: one.weight, known, low: known, high: known };
        const low = known.slice(), high = known.slice(), lows = unpacked(one.low, one.gaps.length), highs = unpacked(one.high, one.gaps.length);
        one.gaps.forEach((k, n) => { low[k] = lows[n]; high[k] = highs[n]; });
        return { question: one.question, weight: one.weight, known, low, high };
      }),
    }));
  }

  // weighted means of one zone: with what is known, and with the unknown at its worst and best
  function inZone(zone, factors) {
    const n = zone.rows.length, known = new Float64Array(n), part = new Float64Array(n), low = new Float64Array(n), high = new Float64Array(n);
    let sum = 0;
    for (const one of zone.criteria) {
      const weight = one.weight * (one.question in factors ? factors[one.question] : 1);
      sum += weight;
      for (let k = 0; k < n; k++) {
        if (!Number.isNaN(one.known[k])) {
          known[k] += weight * one.known[k];
          part[k] += weight;
        }
        low[k] += weight * one.low[k];
        high[k] += weight * one.high[k];
      }
    }
    const overall = new Float64Array(n);
    for (let k = 0; k < n; k++) {
      low[k] /= sum;
      high[k] /= sum;
      const mean = known[k] / part[k];
      overall[k] = Number.isNaN(mean) ? NaN : part[k] / sum < 1 ? 0.5 * (low[k] + high[k]) : mean;
    }
    return { overall, low, high };
  }

  // halves go to the even neighbour, as in the program
  function rounded(value) {
    const floor = Math.floor(value), over = value - floor;
    if (over !== 0.5) return over < 0.5 ? floor : floor + 1;
    return floor % 2 === 0 ? floor : floor + 1;
  }
  // ranks by the low mark; equal ones share a rank, and the next rank is left out
  function ranksOf(places, steps) {
    const order = places.filter((i) => !Number.isNaN(steps[i])).sort((a, b) => steps[b] - steps[a] || a - b);
    const rank = new Map();
    order.forEach((i, k) => rank.set(i, k && steps[i] === steps[order[k - 1]] ? rank.get(order[k - 1]) : k + 1));
    return { order, rank };
  }

  // factors: question → by how much its weights are multiplied
  function marks(factors) {
    zones = zones || unpackedZones();
    const overall = new Float64Array(count), share = new Float64Array(count), low = new Float64Array(count), high = new Float64Array(count);
    const lowest = new Float64Array(count).fill(Infinity), highest = new Float64Array(count).fill(-Infinity);
    for (const zone of zones) {
      const one = inZone(zone, factors);
      zone.rows.forEach((i, k) => {
        if (!Number.isNaN(one.overall[k])) {
          overall[i] += zone.shares[k] * one.overall[k];
          share[i] += zone.shares[k];
        }
        low[i] += zone.shares[k] * one.low[k];
        high[i] += zone.shares[k] * one.high[k];
        lowest[i] = Math.min(lowest[i], one.low[k]);
        highest[i] = Math.max(highest[i], one.high[k]);
      });
    }
    for (const i of data.weighing.open) {
      low[i] = lowest[i];
      high[i] = highest[i];
    }
    const steps = new Float64Array(count), judged = [];
    for (let i = 0; i < count; i++) {
      overall[i] /= share[i];
      if (!isRanked[i]) continue;
      steps[i] = rounded(low[i] / data.weighing.tie);
      judged.push(i);
    }
    const { order, rank } = ranksOf(judged, steps);
    const byZone = new Map(), inItsZone = new Map();
    for (const i of judged) {
      if (!byZone.has(plots.zone[i])) byZone.set(plots.zone[i], []);
      byZone.get(plots.zone[i]).push(i);
    }
    for (const places of byZone.values()) for (const [i, n] of ranksOf(places, steps).rank) inItsZone.set(i, n);
    const kept = (values) => Array.from(values, (value, i) => (isRanked[i] && !Number.isNaN(value) ? value : null));
    const from = (ranks) => plots.plot.map((_, i) => (ranks.has(i) ? ranks.get(i) : null));
    return { mark: kept(overall), low: kept(low), high: kept(high), rank: from(rank), rankInZone: from(inItsZone), order, isProfile: false };
  }

  const atProfile = { mark: plots.overall_mark, low: plots.mark_low, high: plots.mark_high, rank: plots.rank, rankInZone: plots.rank_in_zone, order: page.ranked, isProfile: true };
  page.now = atProfile;

  // made ready while nobody waits, so that the first change is as quick as the others
  (window.requestIdleCallback || ((then) => setTimeout(then, 300)))(() => { zones = zones || unpackedZones(); });

  function apply(what) {
    const before = page.now;
    Object.assign(stops, what);
    const isProfile = Object.values(stops).every((stop) => stop === PROFILE);
    page.now = isProfile ? atProfile : marks(Object.fromEntries(Object.entries(stops).map(([name, stop]) => [name, STOPS[stop].factor])));
    page.before = before;
    page.change({ weights: Object.keys(what) });
  }
  const set = (question, stop) => apply({ [question]: stop });
  const reset = () => apply(Object.fromEntries(Object.keys(stops).map((name) => [name, PROFILE])));
  const changed = () => data.questions.filter((one) => stops[one.name] !== PROFILE);
  return { STOPS, PROFILE, stops, marks, set, reset, changed };
})();
