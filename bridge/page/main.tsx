import { render } from 'preact';
import './style/tokens.css';
import './style/page.css';
import './style/panels.css';
import { connect } from './store/connection.js';
import { App } from './views/app.js';

connect();
const place = document.getElementById('app');
if (place !== null) render(<App />, place);
