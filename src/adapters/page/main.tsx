import 'uplot/dist/uPlot.min.css';
import './style/base.css';
import './style/panels.css';
import './style/drawing.css';
import './style/verdict.css';
import './style/operator.css';
import './style/alarms.css';
import './style/maintenance.css';
import './style/trader.css';
import './style/site.css';
import './style/login.css';
import { options, render } from 'preact';
import { App } from './app/App.js';
import { byId } from './lib/dom.js';
import { begin, startTimers } from './lib/page.js';

// At most one drawing per frame, however much a fast recording sends; none while nobody looks.
options.debounceRendering = (draw) => window.requestAnimationFrame(draw);

render(<App />, byId('app'));
startTimers();
void begin();
