/* Every page works without this file. With it, logging keeps your place on the Rounds. */
"use strict";
(() => {
  for (const select of document.querySelectorAll("form.sieve select"))
    select.addEventListener("change", () => select.form.requestSubmit());

  for (const sheet of document.querySelectorAll(".sheet"))
    if (sheet.scrollWidth > sheet.clientWidth) sheet.tabIndex = 0;

  const form = document.getElementById("log");
  if (!form) return;
  const hours = (input) => { input.inputMode = "decimal"; input.autocomplete = "off"; };
  form.querySelectorAll("input[name^='h.']").forEach(hours);

  form.addEventListener("submit", async (event) => {
    event.preventDefault();
    const said = document.getElementById("said");
    const filled = [...form.querySelectorAll("input[name^='h.']")].filter((i) => i.value.trim());
    if (!filled.length) { said.textContent = "Write the hours into a row first."; return; }
    const body = new URLSearchParams(new FormData(form));
    for (const [name, value] of [...body]) if (name.startsWith("h.") && !value.trim()) body.delete(name);
    said.textContent = "Logging …";
    let answer;
    try {
      answer = await fetch(form.action, { method: "POST", body, headers: { "Rillbook-Fragment": "rows" } });
    } catch { said.textContent = "No connection: nothing was logged. Your hours are still here; try again."; return; }
    if (!answer.ok && answer.status !== 422) { said.textContent = "Nothing was logged: the server answered " + answer.status + "."; return; }
    const part = new DOMParser().parseFromString(await answer.text(), "text/html");
    for (const row of part.querySelectorAll("tr[id]")) {
      document.getElementById(row.id)?.replaceWith(row);
      row.querySelectorAll("input[name^='h.']").forEach(hours);
      row.classList.add("fresh");
    }
    form.elements.token.value = part.querySelector("input[name=token]").value;
    said.textContent = part.querySelector("[data-said]").textContent;
    const wrong = form.querySelector("[aria-invalid]");
    (wrong || document.querySelector(`[name="${CSS.escape(filled[0].name)}"]`))?.focus();
  });
})();
