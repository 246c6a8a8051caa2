//! What happens when a person or a scheduler ends the program.

/// From now on, SIGINT and SIGTERM remove unfinished files before they end the program, which then ends
/// as these signals end any program. SIGKILL cannot be caught: it may leave a `.genewane-*` file, but
/// never one under its final name.
pub fn watch() {
    #[cfg(unix)]
    {
        use signal_hook::consts::{SIGINT, SIGTERM};
        // Without the watch, signals end the program as they always do.
        let Ok(mut signals) = signal_hook::iterator::Signals::new([SIGINT, SIGTERM]) else {
            return;
        };
        std::thread::spawn(move || {
            if let Some(signal) = signals.forever().next() {
                crate::files::remove_unfinished();
                eprintln!("genewane: stopped; no output was written");
                let _ = signal_hook::low_level::emulate_default_handler(signal);
            }
        });
    }
}
