/** Starts the window: connects to the program, mounts the page, opens the study. Runs in the page. */
import '@fontsource-variable/source-sans-3/wght.css'
import '@fontsource-variable/source-sans-3/wght-italic.css'
import '@fontsource-variable/source-serif-4/wght.css'
import './ui/base.css'
import { mount } from 'svelte'
import App from './App.svelte'
import { connect } from './client.ts'
import { StudyStore } from './state/study-store.svelte.ts'
import { applyTheme } from './state/theme.svelte.ts'

const target = document.getElementById('window')
if (target === null) throw new Error('the page has no #window element')
applyTheme()
const store = new StudyStore(connect())
mount(App, { target, props: { store } })
void store.start()
