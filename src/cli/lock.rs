//! One run at a time in a folder: the folder itself is locked by the system for
//! as long as the run lives, so that no lock outlasts a run that was killed.

use std::fs::{File, TryLockError};
use std::path::Path;

use super::message::Failure;

/// Held until dropped.
#[derive(Debug)]
pub struct Lock {
    _folder: Option<File>,
}

impl Lock {
    /// Refuses where another run holds `folder`. Systems that cannot lock a
    /// folder go unguarded.
    pub fn take(folder: &Path) -> Result<Self, Failure> {
        let Ok(opened) = File::open(folder) else {
            return Ok(Lock { _folder: None });
        };
        match opened.try_lock() {
            Ok(()) => Ok(Lock {
                _folder: Some(opened),
            }),
            Err(TryLockError::WouldBlock) => Err(Failure::Input(format!(
                "{}: another run is writing into this folder; wait for its end or give another --out",
                folder.display()
            ))),
            Err(TryLockError::Error(_)) => Ok(Lock { _folder: None }),
        }
    }
}
