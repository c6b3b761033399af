/** Runs before the page is painted: the remembered appearance, and the word that scripts run at all. */
const key = 'sweep-almanac-appearance';
const page = document.documentElement;
page.classList.add('scripted');

type Appearance = 'light' | 'dark';

function remembered(): Appearance | null {
  try {
    const value = localStorage.getItem(key);
    return value === 'light' || value === 'dark' ? value : null;
  } catch {
    return null; // storage is closed to this page: the system's choice holds
  }
}

const systemDark = matchMedia('(prefers-color-scheme: dark)');
const inForce = (): Appearance => remembered() ?? (systemDark.matches ? 'dark' : 'light');

const first = remembered();
if (first) page.dataset['appearance'] = first;

document.addEventListener('DOMContentLoaded', () => {
  const button = document.getElementById('appearance');
  if (!button) return;
  let now = inForce();
  const label = (): void => {
    button.textContent = now === 'dark' ? 'Light page' : 'Dark page';
  };
  label();
  button.hidden = false;
  button.addEventListener('click', () => {
    now = now === 'dark' ? 'light' : 'dark';
    page.dataset['appearance'] = now;
    try {
      localStorage.setItem(key, now);
    } catch {
      // not remembered, but in force on this page
    }
    label();
  });
});
