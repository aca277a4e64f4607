import { Command } from 'commander';
export const explainCommand = () => new Command('explain');
