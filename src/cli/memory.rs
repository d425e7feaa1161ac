//! How much memory the process has used and how much there is, where the system tells.

/// Largest resident memory of this process so far, bytes: `VmHWM` of `/proc/self/status`. `None` where there is no such
/// file.
pub(crate) fn peak() -> Option<u64> {
    field(&std::fs::read_to_string("/proc/self/status").ok()?, "VmHWM:")
}

/// Memory that can be used without swapping, bytes: `MemAvailable` of `/proc/meminfo`.
pub(crate) fn available() -> Option<u64> {
    field(&std::fs::read_to_string("/proc/meminfo").ok()?, "MemAvailable:")
}

fn field(text: &str, name: &str) -> Option<u64> {
    let line = text.lines().find_map(|line| line.strip_prefix(name))?;
    let kilobytes: u64 = line.trim().strip_suffix("kB")?.trim().parse().ok()?;
    kilobytes.checked_mul(1024)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reads_kilobytes() {
        assert_eq!(field("VmPeak:\t 9 kB\nVmHWM:\t   2048 kB\n", "VmHWM:"), Some(2_097_152));
        assert_eq!(field("VmPeak:\t 9 kB\n", "VmHWM:"), None);
        assert_eq!(field("VmHWM: many kB\n", "VmHWM:"), None);
    }
}
