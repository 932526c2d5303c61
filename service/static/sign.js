/* Live preview: the page is fetched for what stands in the form, and its result takes the old one's place. */
"use strict";
(() => {
  const form = document.getElementById("sign-form");
  let timer = 0;
  let asked = 0;

  async function refresh() {
    const mine = ++asked;
    const result = document.getElementById("sign-result");
    result.classList.add("busy");
    const filled = [...new FormData(form)].filter(([, value]) => value !== "");
    try {
      const answer = await fetch(`/sign?${new URLSearchParams(filled)}`, { headers: { accept: "text/html" } });
      const page = new DOMParser().parseFromString(await answer.text(), "text/html");
      const fresh = page.getElementById("sign-result");
      if (mine !== asked) return;
      if (fresh === null) { form.submit(); return; }
      result.replaceWith(fresh);
      history.replaceState(null, "", answer.url);
    } catch {
      result.classList.remove("busy");
    }
  }

  form.addEventListener("input", () => {
    clearTimeout(timer);
    timer = setTimeout(refresh, 350);
  });
})();
