(function () {
  "use strict";
  const root = document.documentElement;
  const all = function (query) { return Array.from(document.querySelectorAll(query)); };
  root.classList.add("scripted");

  const theme = document.getElementById("theme");
  const systemDark = window.matchMedia("(prefers-color-scheme: dark)");
  const dark = function () { return root.dataset.theme ? root.dataset.theme === "dark" : systemDark.matches; };
  const showTheme = function () { theme.setAttribute("aria-pressed", String(dark())); };
  theme.addEventListener("click", function () {
    root.dataset.theme = dark() ? "light" : "dark";
    showTheme();
  });
  systemDark.addEventListener("change", showTheme);
  showTheme();

  const details = document.getElementById("details");
  if (details) {
    details.addEventListener("click", function () {
      const open = all("details").some(function (each) { return !each.open; });
      all("details").forEach(function (each) { each.open = open; });
      details.setAttribute("aria-pressed", String(open));
    });
  }
  window.addEventListener("beforeprint", function () {
    all("details").forEach(function (each) { each.open = true; });
  });

  all("[data-show]").forEach(function (button) {
    button.addEventListener("click", function () {
      document.getElementById("boards").dataset.side = button.dataset.show;
      all("[data-show]").forEach(function (each) { each.setAttribute("aria-pressed", String(each === button)); });
    });
  });
})();
