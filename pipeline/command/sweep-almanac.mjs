#!/usr/bin/env node
import { nodeIsRecent } from './require-node.mjs';

if (nodeIsRecent) await import('./main.ts');
