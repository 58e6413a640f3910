"use strict";
(() => {
  const token = new URLSearchParams(location.search).get("token");
  const status = document.createElement("p");
  status.className = "live-status quiet";
  status.setAttribute("role", "status");
  document.body.prepend(status);
  const say = text => { status.textContent = text; };

  // A row is known by its words; one whose words were not there before has changed.
  const rows = main => [...main.querySelectorAll(".row, .summary, .body > p, .body > h1, .body > h2, .body > h3, .comment")];
  const count = main => {
    const seen = new Map();
    for (const r of rows(main)) seen.set(r.textContent, (seen.get(r.textContent) || 0) + 1);
    return seen;
  };
  // What is read stays where it is: the first row in the window that is known in both
  // texts by words that come once.
  const anchor = (old, fresh) => {
    const before = count(old), after = count(fresh);
    let held = null;
    for (const r of rows(old)) {
      const text = r.textContent;
      if (before.get(text) !== 1 || after.get(text) !== 1) continue;
      const box = r.getBoundingClientRect();
      if (held && box.top > innerHeight) break;
      held = {text, top: box.top};
      if (box.bottom > 0) break;
    }
    return held;
  };
  const show = text => {
    const next = new DOMParser().parseFromString(text, "text/html");
    const fresh = next.getElementById("report");
    const old = document.getElementById("report");
    if (!fresh || !old) return;
    const before = count(old), held = anchor(old, fresh), y = scrollY;
    const open = new Set([...old.querySelectorAll("details[open]")].map(d => d.closest(".row")?.id));
    const adopted = document.adoptNode(fresh);
    for (const r of rows(adopted)) {
      const left = before.get(r.textContent) || 0;
      if (left > 0) before.set(r.textContent, left - 1);
      else r.classList.add("changed");
    }
    for (const d of adopted.querySelectorAll("details")) if (open.has(d.closest(".row")?.id)) d.open = true;
    old.replaceWith(adopted);
    document.title = next.title;
    const head = document.querySelector("body > header"), headNext = next.querySelector("body > header");
    if (head && headNext) head.replaceWith(document.adoptNode(headNext));
    const same = held && rows(adopted).find(r => r.textContent === held.text);
    scrollTo(0, same ? scrollY + same.getBoundingClientRect().top - held.top : y);
  };

  // The server answers when there is a later version than the one shown, or after a while.
  let version = document.documentElement.dataset.version || "0";
  const wait = async () => {
    for (;;) {
      try {
        const answer = await fetch("/next?token=" + encodeURIComponent(token) + "&after=" + encodeURIComponent(version), {cache: "no-store"});
        if (answer.status === 200) {
          const text = await answer.text();
          version = answer.headers.get("X-Report-Version") || version;
          show(text);
          document.documentElement.dataset.version = version;
        } else if (answer.status !== 204) throw new Error(String(answer.status));
        say("");
      } catch {
        say("The program that makes this page does not answer.");
        await new Promise(done => setTimeout(done, 1000));
      }
    }
  };
  wait();
})();
