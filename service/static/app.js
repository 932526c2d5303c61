"use strict";
/* Refreshes the answer while somebody types. Without it the form works by its buttons. */
{
  const form = document.getElementById("sheet");
  const answer = document.getElementById("answer");
  const said = document.getElementById("said");
  const desk = document.querySelector(".desk");
  const WAIT = 250;
  let timer = 0;
  let running = null;
  let here = location.pathname + location.search;

  /* Fields of another kind of emission, beam or duration are hidden; what stands in them is not sent. */
  const settle = () => {
    for (const part of form.querySelectorAll("[class*='for-']")) {
      const hidden = getComputedStyle(part).display === "none";
      for (const field of part.querySelectorAll("input, select")) field.disabled = hidden;
    }
  };

  const query = () => {
    const filled = [...new FormData(form)].filter(([, value]) => typeof value === "string" && value.trim());
    return new URLSearchParams(filled).toString();
  };

  const mark = (name, text) => {
    const field = document.getElementById(name);
    const frame = field?.closest(".field");
    if (!frame) return;
    const message = Object.assign(document.createElement("p"), { className: "error live", id: `${name}-error` });
    const strong = Object.assign(document.createElement("strong"), { textContent: "Check: " });
    message.append(strong, text);
    frame.querySelector(".entry").before(message);
    frame.classList.add("wrong");
    field.setAttribute("aria-invalid", "true");
  };

  const unmark = () => {
    for (const message of form.querySelectorAll(".field .error")) message.remove();
    for (const frame of form.querySelectorAll(".wrong")) frame.classList.remove("wrong");
    for (const field of form.querySelectorAll("[aria-invalid]")) field.removeAttribute("aria-invalid");
  };

  /* What has the focus, or what is on top of the window, stays where it is; folds stay as they were. */
  const replace = (markup) => {
    const still = form.contains(document.activeElement) ? document.activeElement : null;
    const before = still?.getBoundingClientRect().top;
    const folds = new Map([...answer.querySelectorAll("details")].map((d) => [d.innerText.split("\n")[0], d.open]));
    const places = [...answer.querySelectorAll(".scroll")].map((s) => s.scrollLeft);
    answer.innerHTML = markup;
    for (const fold of answer.querySelectorAll("details")) fold.open = folds.get(fold.innerText.split("\n")[0]) ?? fold.open;
    answer.querySelectorAll(".scroll").forEach((s, k) => { s.scrollLeft = places[k] ?? 0; });
    if (still) scrollBy(0, still.getBoundingClientRect().top - before);
  };

  const show = (reply) => {
    document.querySelector(".side > .summary")?.remove();
    unmark();
    for (const [name, text] of Object.entries(reply.error)) mark(name, text);
    for (const [id, text] of Object.entries(reply.echo)) {
      const place = document.getElementById(id);
      if (place) place.textContent = text;
    }
    replace(reply.answer);
    document.title = reply.title;
    document.getElementById("title").textContent = reply.named;
    said.textContent = reply.said;
    desk.classList.toggle("answered", reply.answered);
    /* The page that was loaded stays one step back; what is typed on it is one step, not one for each key. */
    if (history.state?.live) history.replaceState({ live: true }, "", reply.address);
    else history.pushState({ live: true }, "", reply.address);
    here = reply.address;
  };

  const refresh = async () => {
    running?.abort();
    running = new AbortController();
    try {
      const reply = await fetch(`/live?${query()}`, { signal: running.signal, headers: { accept: "application/json" } });
      if (!reply.ok) throw new Error(`answer ${reply.status}`);
      show(await reply.json());
    } catch (error) {
      if (error.name === "AbortError") return;
      replace("");
      said.textContent = "The answer could not be refreshed: press Evaluate.";
    }
    answer.removeAttribute("aria-busy");
  };

  /* An answer to other values never stands there as if it were current. */
  const changed = () => {
    settle();
    running?.abort();
    answer.setAttribute("aria-busy", "true");
    clearTimeout(timer);
    timer = setTimeout(refresh, WAIT);
  };

  if (form && answer) {
    settle();
    document.querySelector(".side > .summary")?.focus();
    form.addEventListener("input", changed);
    form.addEventListener("submit", () => { clearTimeout(timer); running?.abort(); });
    addEventListener("popstate", () => { if (location.pathname + location.search !== here) location.reload(); });
  }
}
