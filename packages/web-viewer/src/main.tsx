import { render } from 'preact';
import { Page } from './panels/page.js';
import { createAppState } from './state/app-state.js';
import { createTrackerService } from './state/tracker-service.js';
import './style.css';

const holder = document.getElementById('app');
if (holder === null) throw new Error('index.html has no element with the id "app"');

const state = createAppState(createTrackerService());
render(<Page state={state} />, holder);

// A file dropped beside its field would make the browser leave the page.
for (const kind of ['dragover', 'drop'] as const) {
  window.addEventListener(kind, (event) => event.preventDefault());
}
