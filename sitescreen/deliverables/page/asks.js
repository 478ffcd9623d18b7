// The row of questions, each with its five-stop weight, relative to the profile of the plot's zone.
const asks = (() => {
  const { data, make, state } = page;
  const row = document.getElementById("questions");
  const back = make("button", { type: "button", id: "back", disabled: true, onclick: () => weigh.reset() }, "Back to the zone profile");

  function weight(one) {
    const name = `weight-${one.name}`, word = make("span", { class: "stop", "aria-hidden": "true" }, weigh.STOPS[weigh.PROFILE].word);
    const stops = weigh.STOPS.map((stop, k) => {
      const input = make("input", { type: "radio", name, value: k, "aria-label": stop.word, checked: k === weigh.PROFILE });
      input.addEventListener("change", () => weigh.set(one.name, k));
      return make("label", { title: stop.word }, input, make("i", { class: `bar bar-${k}`, "aria-hidden": "true" }));
    });
    return make("fieldset", { class: "weight" }, make("legend", { class: "unseen" }, `How much ${words.noun(one)} counts`), make("div", { class: "stops" }, ...stops), word);
  }

  function start() {
    const all = [data.overall, ...data.questions];
    row.hidden = false;
    row.replaceChildren(...all.map((one) => make("div", { class: "ask" },
      make("button", { type: "button", "data-question": one.name, "aria-pressed": String(one.name === state.question), onclick: () => page.change({ question: one.name }) }, one.label),
      one === data.overall ? make("p", { class: "weight" }, make("span", { id: "weighed", class: "stop" })) : weight(one))), make("div", { class: "ask back" }, back));
    page.watchers.push((what) => {
      if ("question" in what) press();
      if ("weights" in what) show();
    });
    show();
  }
  function press() {
    for (const button of row.querySelectorAll("[data-question]")) button.setAttribute("aria-pressed", String(button.dataset.question === state.question));
  }
  function show() {
    back.disabled = page.now.isProfile;
    const weighed = document.getElementById("weighed");
    weighed.textContent = page.now.isProfile ? "weighed by each zone’s profile" : "weighed as set here";
    weighed.classList.toggle("changed", !page.now.isProfile);
    for (const one of data.questions) {
      const stop = weigh.stops[one.name], input = row.querySelector(`input[name="weight-${one.name}"][value="${stop}"]`);
      input.checked = true;
      const word = input.closest("fieldset").querySelector(".stop");
      word.textContent = weigh.STOPS[stop].word;
      word.classList.toggle("changed", stop !== weigh.PROFILE);
    }
  }
  return { start };
})();
