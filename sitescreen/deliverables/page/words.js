// The sentences that change with the weights: the answer, what a change did, and how sure the order is.
const words = (() => {
  const { data, plots } = page;
  const head = document.getElementById("answer"), sure = document.getElementById("sure"), change = document.getElementById("change");
  const atProfile = { head: head.textContent, sure: sure.textContent };

  const list = (parts) => (parts.length < 2 ? parts.join("") : `${parts.slice(0, -1).join(", ")} and ${parts[parts.length - 1]}`);
  const noun = (one) => (one.name === "own" ? "your own criteria" : one.column.toLowerCase());
  const upper = (text) => text[0].toUpperCase() + text.slice(1);

  function answer() {
    const changed = weigh.changed(), now = page.now;
    const how = list(changed.map((one) => `${noun(one)} ${weigh.STOPS[weigh.stops[one.name]].counting}`));
    const aside = page.aside.length === 0 ? "" : page.aside.length === 1 ? " One is set aside, as before." : ` ${page.aside.length} are set aside, as before.`;
    if (!now.order.length) return `With ${how}, no plot can be ranked: nothing that its zone asks for counts.${aside}`;
    const leaders = now.order.filter((i) => now.rank[i] === 1), next = now.order.slice(leaders.length, leaders.length + 2);
    const then = next.length ? `, then ${list(next.map(page.called))}` : "";
    const first = leaders.length > 3 ? `${leaders.length} plots lead` : `${list(leaders.map(page.called))} ${leaders.length > 1 ? "lead" : "leads"}`;
    return `With ${how}, ${first}${then}.${aside}`;
  }

  // what the last change of a weight did, against what stood before it
  function said(questions) {
    const before = page.before, now = page.now;
    const which = questions.length === 1 ? data.questions.find((one) => one.name === questions[0]) : null;
    const what = which ? upper(`${noun(which)} ${weigh.STOPS[weigh.stops[which.name]].counts}`) : "Back to the zone profile";
    if (!now.order.length) return `${what}: nothing counts now.`;
    const places = (i) => `from ${page.ordinal(before.rank[i])} to ${page.ordinal(now.rank[i])}`;
    const near = now.order.slice(0, Math.max(3, Math.min(12, data.shortlist)));
    const risen = near.filter((i) => before.rank[i] !== null && now.rank[i] < before.rank[i]);
    const most = risen.sort((a, b) => before.rank[b] - now.rank[b] - (before.rank[a] - now.rank[a]))[0];
    const first = now.order[0], parts = [];
    if (before.rank[first] !== null && before.rank[first] > 1) parts.push(`${page.called(first)} takes the first place, before ${page.ordinal(before.rank[first])}`);
    else if (most !== undefined) parts.push(`${page.called(most)} rises ${places(most)}`);
    else parts.push(near.length > 1 ? `the first ${near.length} stay as they are` : "the first stays as it is");
    const chosen = page.state.chosen;
    if (chosen !== null && chosen !== first && chosen !== most && before.rank[chosen] !== null && now.rank[chosen] !== null && now.rank[chosen] !== before.rank[chosen]) {
      parts.push(`${page.called(chosen)} ${now.rank[chosen] < before.rank[chosen] ? "rises" : "falls"} ${places(chosen)}`);
    }
    return `${what}: ${parts.join("; ")}.`;
  }

  function show(questions) {
    const isProfile = page.now.isProfile;
    document.body.classList.toggle("reweighed", !isProfile);
    head.textContent = isProfile ? atProfile.head : answer();
    sure.textContent = isProfile ? atProfile.sure
      : "How sure the order is was worked out for the zone profile’s weights; for these it is not known.";
    if (questions) change.textContent = said(questions);
  }
  page.watchers.push((what) => { if (what.weights) show(what.weights); });
  return { answer, noun, plots };
})();
