// What is typed into a form marked data-keep survives a reload, a lost network and a sign-in that
// ran out: it is kept in this tab until the form has been recorded.

const PREFIX = "typed ";
const fieldsOf = (form) =>
  [...form.elements].filter((field) => field.name && !["hidden", "password"].includes(field.type));

function remember(form) {
  const typed = {};
  for (const field of fieldsOf(form)) {
    if (["radio", "checkbox"].includes(field.type)) {
      if (field.checked) (typed[field.name] ??= []).push(field.value);
    } else typed[field.name] = [field.value];
  }
  sessionStorage.setItem(PREFIX + form.dataset.keep, JSON.stringify(typed));
}

function putBack(form) {
  const kept = sessionStorage.getItem(PREFIX + form.dataset.keep);
  if (!kept) return;
  const typed = JSON.parse(kept);
  const told = document.createElement("p");
  told.className = "hint";
  told.textContent = "What was typed here before is put back.";
  form.prepend(told);
  for (const field of fieldsOf(form)) {
    const values = typed[field.name] ?? [];
    if (["radio", "checkbox"].includes(field.type)) field.checked = values.includes(field.value);
    else if (values.length) field.value = values[0];
  }
}

export function keepTyped() {
  const failed = document.body.classList.contains("error") || document.getElementById("refusal");
  const sent = sessionStorage.getItem("sent");
  if (sent && !failed) sessionStorage.removeItem(PREFIX + sent);
  if (!failed) sessionStorage.removeItem("sent");
  for (const form of document.querySelectorAll("form[data-keep]")) {
    if (!failed) putBack(form);
    form.addEventListener("input", () => remember(form));
    form.addEventListener("submit", () => sessionStorage.setItem("sent", form.dataset.keep));
  }
}
