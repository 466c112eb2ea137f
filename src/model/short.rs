use super::file::TowerText;
use super::table::Section;
pub(super) fn read_plan(_document: &Section<'_>, _text: &mut TowerText) -> bool {
    false
}
