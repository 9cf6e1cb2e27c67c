// Conveniences of every page. Without scripts all forms work the same.

import { keepTyped } from "./keep.js";

// A second tap while the first is under way sends nothing; the form's key would make it harmless
// anyway, but a still button says that the first tap was felt.
document.addEventListener("submit", (event) => {
  const form = event.target;
  if (form.dataset.sent) {
    event.preventDefault();
    return;
  }
  form.dataset.sent = "yes";
  // The next person at this tablet begins with empty forms.
  if (new URL(form.action).pathname === "/sign-out") sessionStorage.clear();
  // The button that was pressed carries a value: disable after the form data is taken.
  setTimeout(() => {
    for (const button of form.querySelectorAll("button")) button.disabled = true;
  });
});

// A page that comes back from the browser's memory can be sent again.
window.addEventListener("pageshow", (event) => {
  if (!event.persisted) return;
  for (const form of document.forms) {
    delete form.dataset.sent;
    for (const button of form.querySelectorAll("button")) button.disabled = false;
  }
});

document.getElementById("refusal")?.focus();

keepTyped();
