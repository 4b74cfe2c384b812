import fc from 'fast-check';

// Files that share a process: what one has set for all its random tests is not another's.
fc.resetConfigureGlobal();
